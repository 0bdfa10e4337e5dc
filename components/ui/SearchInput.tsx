'use client';

import { usePathname, useRouter, useSearchParams } from 'next/navigation';
import { useEffect, useRef, useState } from 'react';
import { hrefWith } from './address';
import { cx } from './cx';

export interface SearchInputProps {
  label: string;
  placeholder?: string;
  /** Name in the address; `q` unless told. */
  param?: string;
  className?: string;
}

/** A search that writes itself into the address a moment after the last key, and starts paging afresh. */
export function SearchInput({ label, placeholder, param = 'q', className }: SearchInputProps) {
  const router = useRouter();
  const pathname = usePathname();
  const search = useSearchParams();
  const inAddress = search.get(param) ?? '';
  const [value, setValue] = useState(inAddress);
  const written = useRef(inAddress);
  useEffect(() => {
    // Back, or a cleared filter, changed the address under us.
    if (inAddress !== written.current) {
      written.current = inAddress;
      setValue(inAddress);
    }
  }, [inAddress]);
  useEffect(() => {
    if (value === written.current) return;
    const timer = setTimeout(() => {
      written.current = value;
      router.replace(hrefWith(pathname, search, { [param]: value || null, before: null, after: null }), {
        scroll: false,
      });
    }, 250);
    return () => clearTimeout(timer);
  }, [value, param, pathname, router, search]);
  return (
    <input
      type="search"
      aria-label={label}
      placeholder={placeholder ?? label}
      value={value}
      onChange={(event) => setValue(event.target.value)}
      className={cx(
        'min-w-[220px] max-w-[340px] flex-1 rounded-plate border border-line-control bg-sheet px-[11px] py-[7px]',
        className,
      )}
    />
  );
}
