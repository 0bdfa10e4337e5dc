'use client';

import { useRouter } from 'next/navigation';
import { useState } from 'react';
import useSWR from 'swr';
import { IdentifiersForm } from '@/components/bedside/IdentifiersForm';
import { bornInWords } from '@/components/bedside/words';
import { getJson } from '@/components/shell/useData';
import { Checkbox, FieldSet } from '@/components/ui/Checkbox';
import { Dialog } from '@/components/ui/Dialog';
import { Field, TextInput } from '@/components/ui/Field';
import { tell } from '@/components/ui/Toast';

interface Found {
  rows: {
    id: string;
    number: string;
    familyName: string;
    givenName: string;
    birthDate: string | null;
    recordNumber: string;
    bed: string | null;
  }[];
}

/** Move a recording to another encounter, or file one that is in the tray: search, read two identifiers, and why. */
export function MoveFiling({ number, from }: { number: string; from: string | null }) {
  const router = useRouter();
  const [open, setOpen] = useState(false);
  const [q, setQ] = useState('');
  const [to, setTo] = useState<string | null>(null);
  const { data, error } = useSWR<Found>(
    open ? `/api/encounters?q=${encodeURIComponent(q)}&limit=8` : null,
    getJson,
    { keepPreviousData: true },
  );
  const verb = from === null ? 'File' : 'Move';
  const target = data?.rows.find((row) => row.id === to);
  return (
    <>
      <button type="button" className="link" onClick={() => setOpen(true)}>
        {from === null ? 'File to an encounter…' : 'Move to another encounter…'}
      </button>
      <Dialog
        open={open}
        onOpenChange={setOpen}
        wide
        title={`${verb} ${number}`}
        description={
          from === null
            ? 'It is in the tray. Choose the encounter it belongs to.'
            : `It is filed to ${from}. That filing stays readable in the custody thread.`
        }
      >
        <div className="grid gap-5">
          <Field
            label="Find the encounter"
            help="Name, record number, encounter number or bed; on your wards."
          >
            <TextInput
              value={q}
              onChange={(event) => {
                setQ(event.target.value);
                setTo(null);
              }}
              autoComplete="off"
              className="min-h-11"
            />
          </Field>
          {error ? <p className="text-rust">{error.message}</p> : null}
          <FieldSet legend="Encounter">
            <div className="grid gap-1">
              {(data?.rows ?? [])
                .filter((row) => row.number !== from)
                .map((row) => (
                  <div key={row.id} className="min-h-11 content-center">
                    <Checkbox
                      radio
                      name="encounter"
                      checked={row.id === to}
                      onChange={() => setTo(row.id)}
                      label={
                        <>
                          {row.familyName}, {row.givenName}, born {bornInWords(row.birthDate)},{' '}
                          <span className="mono">{row.number}</span>
                          {row.bed ? `, ${row.bed}` : ''}
                        </>
                      }
                    />
                  </div>
                ))}
              {data && data.rows.length === 0 ? (
                <p className="text-ink-soft">No running encounter on your wards matches.</p>
              ) : null}
            </div>
          </FieldSet>
          {target ? (
            <IdentifiersForm
              key={target.id}
              url={`/api/recordings/${number}/${from === null ? 'file' : 'move'}`}
              encounterId={target.id}
              {...(from === null ? {} : { from })}
              submitLabel={`${verb} to ${target.number}`}
              onDone={() => {
                tell(`${number} is filed to ${target.number}`);
                setOpen(false);
                router.refresh();
              }}
            />
          ) : null}
        </div>
      </Dialog>
    </>
  );
}
