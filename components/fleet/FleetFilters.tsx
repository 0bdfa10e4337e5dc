'use client';

import { usePathname, useRouter } from 'next/navigation';
import { hrefWith } from '@/components/ui/address';
import { Chip, Filters } from '@/components/ui/Chip';
import { Select } from '@/components/ui/Field';
import { SearchInput } from '@/components/ui/SearchInput';

interface Props {
  search: Record<string, string | string[] | undefined>;
  filter: {
    state?: string | undefined;
    due?: string | undefined;
    ward?: string | undefined;
    model?: string | undefined;
    firmware?: string | undefined;
  };
  counts: {
    all: number;
    inService: number;
    waiting: number;
    quarantined: number;
    inRepair: number;
    due: number;
    quiet: number;
  };
  choices: {
    wards: { id: string; name: string }[];
    models: { id: string; name: string }[];
    firmwares: string[];
  };
}

/** The fleet's filters; all of them stand in the address, so a view can be kept and sent. */
export function FleetFilters({ search, filter, counts, choices }: Props) {
  const router = useRouter();
  const pathname = usePathname();
  const link = (changes: Record<string, string | null>) =>
    hrefWith(pathname, search, { after: null, ...changes });
  const only = (changes: Record<string, string | null>) => link({ state: null, due: null, ...changes });
  const chip = (label: string, on: boolean, changes: Record<string, string | null>) => (
    <Chip href={on ? only({}) : only(changes)} current={on}>
      {label}
    </Chip>
  );
  const select = (
    label: string,
    param: 'ward' | 'model' | 'firmware',
    all: string,
    options: { value: string; label: string }[],
  ) => (
    <Select
      aria-label={label}
      className="w-auto! max-w-[200px] py-[6px]! text-13 min-h-0!"
      placeholder={all}
      options={options}
      value={filter[param] ?? ''}
      onChange={(event) => router.replace(link({ [param]: event.target.value || null }), { scroll: false })}
    />
  );
  return (
    <Filters>
      <SearchInput label="Asset tag, serial number or UDI" />
      {chip('In service', filter.state === 'in-service', { state: 'in-service' })}
      {chip(`Quarantined ${counts.quarantined}`, filter.state === 'quarantined', { state: 'quarantined' })}
      {chip(`In repair ${counts.inRepair}`, filter.state === 'in-repair', { state: 'in-repair' })}
      {chip(`Check due ${counts.due}`, filter.due === 'check', { due: 'check' })}
      {chip(`Gone quiet ${counts.quiet}`, filter.due === 'quiet', { due: 'quiet' })}
      {chip(`Waiting for enrolment ${counts.waiting}`, filter.state === 'waiting', { state: 'waiting' })}
      {select(
        'Ward',
        'ward',
        'All wards',
        choices.wards.map(({ id, name }) => ({ value: id, label: name })),
      )}
      {select(
        'Model',
        'model',
        'All models',
        choices.models.map(({ id, name }) => ({ value: id, label: name })),
      )}
      {select(
        'Firmware',
        'firmware',
        'All firmware',
        choices.firmwares.map((value) => ({ value, label: value })),
      )}
    </Filters>
  );
}
