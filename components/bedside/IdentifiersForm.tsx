'use client';

import { type FormEvent, useState } from 'react';
import { useAct } from '@/components/identity/useAct';
import type { ProblemError } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { Field, Textarea, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { Time } from '@/components/ui/Time';

interface Props {
  /** Where it is sent. */
  url: string;
  encounterId: string;
  /** Moving: the version of the recording that is shown; then a reason is asked for. */
  version?: number | undefined;
  submitLabel: string;
  onDone: () => void;
  /** Somebody else was first: what is shown is out of date. */
  onOutdated: () => void;
}

/** Two identifiers are read from the wristband or asked of the patient before anything is filed. */
export function IdentifiersForm({ url, encounterId, version, submitLabel, onDone, onOutdated }: Props) {
  const { act, busy, failure } = useAct(url);
  const [touched, setTouched] = useState(false);
  const moving = version !== undefined;
  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    setTouched(false);
    const form = new FormData(event.currentTarget);
    const value = (name: string) => String(form.get(name) ?? '').trim();
    const answer = await act({
      encounterId,
      identifiers: { recordNumber: value('recordNumber'), second: value('second') },
      ...(moving ? { version, reason: value('reason') } : {}),
    });
    if (answer) onDone();
  }
  return (
    <form onSubmit={submit} onChange={() => setTouched(true)} className="grid gap-4">
      {failure && !touched ? <Refused failure={failure} onOutdated={onOutdated} /> : null}
      <Field label="Record number" help="Read it from the wristband, not from this screen." required>
        <TextInput
          name="recordNumber"
          mono
          autoComplete="off"
          autoCapitalize="characters"
          spellCheck={false}
          autoFocus
          className="min-h-11"
        />
      </Field>
      <Field
        label="Date of birth or family name"
        help="A date as 1951-03-14, 14 Mar 1951 or 14.3.1951."
        required
      >
        <TextInput name="second" autoComplete="off" spellCheck={false} className="min-h-11" />
      </Field>
      {moving ? (
        <Field label="Reason for moving" help="It stands in the custody thread with your name." required>
          <Textarea name="reason" minLength={5} maxLength={500} />
        </Field>
      ) : null}
      <div>
        <Button type="submit" variant="primary" size="large" busy={busy}>
          {submitLabel}
        </Button>
      </div>
    </form>
  );
}

const OUTDATED = new Set(['already-filed', 'stale', 'not-found']);

function Refused({ failure, onOutdated }: { failure: ProblemError; onOutdated: () => void }) {
  const { at } = failure.members;
  return (
    <Notice
      tone={OUTDATED.has(failure.code) ? 'care' : 'alarm'}
      title={failure.title}
      live
      action={
        OUTDATED.has(failure.code) ? (
          <Button className="min-h-11" onClick={onOutdated}>
            Show how it stands now
          </Button>
        ) : null
      }
    >
      <p>{failure.message}</p>
      {typeof at === 'number' ? (
        <p>
          That was <Time at={at} ago />.
        </p>
      ) : null}
    </Notice>
  );
}
