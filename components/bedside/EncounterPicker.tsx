'use client';

import { useId, useState } from 'react';
import useSWR from 'swr';
import { getJson, type ProblemError } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { cx } from '@/components/ui/cx';
import { Field, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { bornInWords, listNameOf } from './words';

/** An encounter to choose, with both identifiers of its patient. */
export interface EncounterChoice {
  id: string;
  number: string;
  familyName: string;
  givenName: string;
  birthDate: string | null;
  recordNumber: string;
  ward: string | null;
  bed: string | null;
}

interface Props {
  chosen: EncounterChoice | null;
  onChoose: (encounter: EncounterChoice | null) => void;
  /** Shown before anything was searched for. */
  first?: readonly EncounterChoice[];
  /** Number of an encounter that is no choice: the one a clip is in already. */
  without?: string | null;
}

const MOST = 8;

/** Search for an encounter and choose it. What was chosen stands alone until it is taken back. */
export function EncounterPicker({ chosen, onChoose, first, without = null }: Props) {
  const [q, setQ] = useState('');
  const name = useId();
  const href = `/api/encounters?limit=${MOST}&q=${encodeURIComponent(q.trim())}`;
  const { data, error, isLoading } = useSWR<{ rows: EncounterChoice[] }, ProblemError>(
    chosen || (q.trim() === '' && first) ? null : href,
    getJson,
    { keepPreviousData: true },
  );
  if (chosen)
    return (
      <div className="flex flex-wrap items-center justify-between gap-3 rounded-plate border border-spruce bg-spruce-wash px-4 py-3">
        <Facts encounter={chosen} />
        <Button className="min-h-11" onClick={() => onChoose(null)}>
          Choose another
        </Button>
      </div>
    );
  const rows = (q.trim() === '' && first ? first : (data?.rows ?? [])).filter(
    (row) => row.number !== without,
  );
  return (
    <div className="grid gap-3">
      <Field label="Find the patient" help="Name, record number, encounter number or bed; on your wards.">
        <TextInput
          type="search"
          value={q}
          onChange={(event) => setQ(event.target.value)}
          autoComplete="off"
          className="min-h-11"
        />
      </Field>
      {error ? <Failed error={error} /> : null}
      <ul aria-label="Encounters" className="rounded-plate border border-line bg-sheet empty:hidden">
        {rows.map((row) => (
          <li key={row.id} className="border-b border-line last:border-b-0">
            <label
              className={cx(
                'flex min-h-[52px] cursor-pointer items-center gap-3 px-4 py-2 hover:bg-spruce-wash',
              )}
            >
              <input
                type="radio"
                name={name}
                checked={false}
                onChange={() => onChoose(row)}
                className="size-[17px] flex-none"
              />
              <Facts encounter={row} />
            </label>
          </li>
        ))}
      </ul>
      {!error && !isLoading && rows.length === 0 ? (
        <p className="text-ink-soft">No running encounter that you may see matches.</p>
      ) : null}
    </div>
  );
}

function Failed({ error }: { error: ProblemError }) {
  if (error.code === 'reason-required')
    return (
      <Notice tone="care" title={error.title} live>
        Open the patient with a reason on Bedside first, then come back.
      </Notice>
    );
  return (
    <Notice tone="alarm" title={error.title}>
      {error.message}
    </Notice>
  );
}

function Facts({ encounter: e }: { encounter: EncounterChoice }) {
  return (
    <span className="min-w-0">
      <b className="block break-words">{listNameOf(e)}</b>
      <span className="flex flex-wrap gap-x-4 text-ink-soft">
        <span>born {bornInWords(e.birthDate)}</span>
        <span className="mono">{e.recordNumber}</span>
        <span className="mono">{e.number}</span>
        <span>{[e.ward, e.bed].filter(Boolean).join(', ')}</span>
      </span>
    </span>
  );
}
