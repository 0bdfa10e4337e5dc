'use client';

import { useRouter } from 'next/navigation';
import { type FormEvent, useEffect, useState } from 'react';
import { Button } from '@/components/ui/Button';
import { Checkbox, FieldSet } from '@/components/ui/Checkbox';
import { Notice } from '@/components/ui/Notice';
import { tell } from '@/components/ui/Toast';
import type { WardChoice } from './InviteButton';
import { useAct } from './useAct';

/** On which wards a person works. What was seen goes along, so that nobody's change is overwritten unseen. */
export function PersonWards({
  id,
  name,
  wards,
  held,
}: {
  id: string;
  name: string;
  wards: readonly WardChoice[];
  held: readonly string[];
}) {
  const router = useRouter();
  const { act, busy, failure } = useAct<{ wardIds: string[] }>(`/api/people/${id}/wards`);
  const [chosen, setChosen] = useState<readonly string[]>(held);
  const seen = held.join();
  // biome-ignore lint/correctness/useExhaustiveDependencies: somebody else's change is shown in place of ours
  useEffect(() => setChosen(held), [seen]);
  const same = [...chosen].sort().join() === [...held].sort().join();
  const submit = async (event: FormEvent) => {
    event.preventDefault();
    const answer = await act({ before: held, after: chosen });
    if (answer) tell(`Wards of ${name} are saved`);
    // After "stale" too: the page then shows what is there now.
    router.refresh();
  };
  if (wards.length === 0) return <p className="text-ink-soft">There are no wards yet.</p>;
  return (
    <form onSubmit={submit} className="grid gap-3">
      {failure ? (
        <Notice tone="alarm" title={failure.title}>
          {failure.message}
        </Notice>
      ) : null}
      <FieldSet
        legend={<span className="sr-only">Wards</span>}
        help="Looking at patients elsewhere asks for a reason."
      >
        <div className="grid grid-cols-[repeat(auto-fill,minmax(180px,1fr))] gap-x-4">
          {wards.map((ward) => (
            <Checkbox
              key={ward.id}
              label={ward.name}
              checked={chosen.includes(ward.id)}
              onChange={(event) =>
                setChosen(
                  event.target.checked ? [...chosen, ward.id] : chosen.filter((one) => one !== ward.id),
                )
              }
            />
          ))}
        </div>
      </FieldSet>
      <div>
        <Button type="submit" busy={busy} disabled={same}>
          Save the wards
        </Button>
      </div>
    </form>
  );
}
