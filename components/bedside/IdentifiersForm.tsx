'use client';

import { type FormEvent, type ReactNode, useState } from 'react';
import { useAct } from '@/components/identity/useAct';
import { Button } from '@/components/ui/Button';
import { Field, Textarea, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';

interface Props {
  /** Where it is sent. */
  url: string;
  encounterId: string;
  /** Moving: the encounter it is in now, and a reason is asked for. */
  from?: string;
  submitLabel: string;
  onDone: () => void;
  children?: ReactNode;
}

/** Two identifiers are read from the wristband or asked of the patient before anything is filed. */
export function IdentifiersForm({ url, encounterId, from, submitLabel, onDone, children }: Props) {
  const { act, busy, failure } = useAct(url);
  const [touched, setTouched] = useState(false);
  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    setTouched(false);
    const form = new FormData(event.currentTarget);
    const value = (name: string) => String(form.get(name) ?? '').trim();
    const answer = await act({
      encounterId,
      identifiers: { recordNumber: value('recordNumber'), second: value('second') },
      ...(from === undefined ? {} : { from, reason: value('reason') }),
    });
    if (answer) onDone();
  }
  return (
    <form onSubmit={submit} onChange={() => setTouched(true)} className="grid gap-4">
      {children}
      {failure && !touched ? (
        <Notice tone="alarm" title={failure.title}>
          {failure.message}
        </Notice>
      ) : null}
      <Field label="Record number" help="Read it from the wristband, not from this screen." required>
        <TextInput name="recordNumber" mono autoComplete="off" autoFocus className="min-h-11" />
      </Field>
      <Field label="Date of birth or family name" help="Date as YYYY-MM-DD." required>
        <TextInput name="second" autoComplete="off" className="min-h-11" />
      </Field>
      {from === undefined ? null : (
        <Field label="Reason for moving" help="It stands in the custody thread with your name." required>
          <Textarea name="reason" minLength={5} maxLength={500} />
        </Field>
      )}
      <div>
        <Button type="submit" variant="primary" size="large" busy={busy}>
          {submitLabel}
        </Button>
      </div>
    </form>
  );
}
