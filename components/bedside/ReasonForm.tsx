'use client';

import { useRouter } from 'next/navigation';
import { type FormEvent, useState } from 'react';
import { useAct } from '@/components/identity/useAct';
import { Button } from '@/components/ui/Button';
import { Dialog } from '@/components/ui/Dialog';
import { Field, Textarea, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';

const WHAT_FOLLOWS =
  'The reason is kept with your name and shown to the auditor. It opens this patient to you for twelve hours.';

/** Open a patient of another ward: the exact number, and the reason, which the auditor sees. */
function ReasonForm({ identifier }: { identifier?: string }) {
  const router = useRouter();
  const { act, busy, failure } = useAct<{ encounterId: string | null }>('/api/patients/reason');
  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    const form = new FormData(event.currentTarget);
    const answer = await act({
      identifier: String(form.get('identifier')),
      reason: String(form.get('reason')),
    });
    if (!answer) return;
    if (answer.encounterId) router.push(`/encounters/${answer.encounterId}`);
    router.refresh();
  }
  return (
    <form onSubmit={submit} className="grid max-w-[520px] gap-4">
      {failure ? (
        <Notice tone="alarm" title={failure.title}>
          {failure.code === 'not-found'
            ? 'No patient or encounter goes by exactly this number.'
            : failure.message}
        </Notice>
      ) : null}
      <Field label="Record number or encounter number" help="Exactly as on the wristband." required>
        <TextInput
          name="identifier"
          defaultValue={identifier}
          readOnly={identifier !== undefined}
          mono
          autoComplete="off"
          minLength={3}
          className="min-h-11"
        />
      </Field>
      <Field label="Reason" help="At least five characters." required>
        <Textarea name="reason" minLength={5} maxLength={500} />
      </Field>
      <div>
        <Button type="submit" variant="primary" className="min-h-11" busy={busy}>
          Open this patient
        </Button>
      </div>
    </form>
  );
}

/** A button that asks for both. */
export function ReasonButton() {
  const [open, setOpen] = useState(false);
  return (
    <>
      <Button className="min-h-11" onClick={() => setOpen(true)}>
        A patient of another ward…
      </Button>
      <Dialog open={open} onOpenChange={setOpen} title="A patient of another ward" description={WHAT_FOLLOWS}>
        <ReasonForm />
      </Dialog>
    </>
  );
}

/** In the place of a patient whose whole number was asked for, and who is outside the person's wards. */
export function ReasonAsked({ identifier }: { identifier: string }) {
  return (
    <section aria-label="Reason for looking" className="grid gap-4">
      <Notice tone="care" title="This patient is outside your wards">
        {WHAT_FOLLOWS}
      </Notice>
      <ReasonForm key={identifier} identifier={identifier} />
    </section>
  );
}
