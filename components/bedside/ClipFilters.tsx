'use client';

import { usePathname, useRouter, useSearchParams } from 'next/navigation';
import { hrefWith } from '@/components/ui/address';
import { Button } from '@/components/ui/Button';
import { TextInput } from '@/components/ui/Field';

interface Props {
  from: string | undefined;
  to: string | undefined;
  device: string | undefined;
}

/** Days and device, written into the address when they are changed. */
export function ClipFilters({ from, to, device }: Props) {
  const router = useRouter();
  const pathname = usePathname();
  const search = useSearchParams();
  const set = (changes: Record<string, string | null>) =>
    router.replace(hrefWith(pathname, search, { before: null, ...changes }), { scroll: false });
  const any = Boolean(from || to || device);
  return (
    <form
      aria-label="Days and device"
      onSubmit={(event) => {
        event.preventDefault();
        const form = new FormData(event.currentTarget);
        const value = (name: string) => String(form.get(name) ?? '').trim() || null;
        set({ from: value('from'), to: value('to'), device: value('device') });
      }}
      className="mb-3 flex flex-wrap items-end gap-3"
    >
      <Labelled label="From">
        <TextInput key={from} name="from" type="date" defaultValue={from} className="min-h-11" />
      </Labelled>
      <Labelled label="To">
        <TextInput key={to} name="to" type="date" defaultValue={to} className="min-h-11" />
      </Labelled>
      <Labelled label="Device">
        <TextInput
          key={device}
          name="device"
          defaultValue={device}
          placeholder="Asset tag"
          mono
          autoComplete="off"
          className="min-h-11 max-w-[16ch]"
        />
      </Labelled>
      <Button type="submit" className="min-h-11">
        Show
      </Button>
      {any ? (
        <Button
          variant="quiet"
          className="min-h-11"
          onClick={() => set({ from: null, to: null, device: null })}
        >
          Take away
        </Button>
      ) : null}
    </form>
  );
}

const Labelled = ({ label, children }: { label: string; children: React.ReactNode }) => (
  // biome-ignore lint/a11y/noLabelWithoutControl: the control is its child
  <label className="grid gap-1 text-13 text-ink-soft">
    {label}
    {children}
  </label>
);
