'use client';

import { usePathname, useRouter, useSearchParams } from 'next/navigation';
import { hrefWith } from '@/components/ui/address';
import { Select } from '@/components/ui/Field';
import { KIND_CHOICES } from './entryWords';

/** What happened, as a filter in the address. */
export function KindFilter({ value }: { value: string }) {
  const router = useRouter();
  const pathname = usePathname();
  const search = useSearchParams();
  return (
    <Select
      aria-label="What happened"
      className="w-auto! max-w-[240px]"
      value={value}
      placeholder="Whatever happened"
      options={KIND_CHOICES}
      onChange={(event) =>
        router.replace(hrefWith(pathname, search, { kind: event.target.value || null, before: null }), {
          scroll: false,
        })
      }
    />
  );
}
