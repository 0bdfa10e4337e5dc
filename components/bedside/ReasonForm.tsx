'use client';

import { useRouter } from 'next/navigation';
import { type FormEvent, useState } from 'react';
import { useAct } from '@/components/identity/useAct';
import { Button } from '@/components/ui/Button';
import { Dialog } from '@/components/ui/Dialog';
import { Field, Textarea, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';

/** Open a patient of another ward: the exact number, and the reason, which the auditor sees. */
export function ReasonForm() {
  const [open, setOpen] = useState(false);
  const router = useRouter();
  const { act, busy, failure } = useAct<{ encounterId: string | null; patientId: string }>(
    '/api/patients/reason',
  );
  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    const form = new FormData(event.currentTarget);
    const answer = await act({
      identifier: String(form.get('identifier')),
      reason: String(form.get('reason')),
    });
    if (!answer) return;
    setOpen(false);
    if (answer.encounterId) router.push(`/encounters/${answer.encounterId}`);
    else router.refresh();
  }
  return (
    <>
      <Button onClick={() => setOpen(true)}>A patient of another ward…</Button>
      <Dialog
        open={open}
        onOpenChange={setOpen}
        title="A patient of another ward"
        description="The reason is kept with your name and shown to the auditor. It opens this patient to you for twelve hours."
      >
        <form onSubmit={submit} className="grid gap-4">
          {failure ? (
            <Notice tone="alarm" title={failure.title}>
              {failure.code === 'not-found'
                ? 'No patient or encounter goes by exactly this number.'
                : failure.message}
            </Notice>
          ) : null}
          <Field label="Record number or encounter number" help="Exactly as on the wristband." required>
            <TextInput name="identifier" mono autoComplete="off" minLength={3} />
          </Field>
          <Field label="Reason" required>
            <Textarea name="reason" minLength={5} maxLength={500} />
          </Field>
          <div>
            <Button type="submit" variant="primary" busy={busy}>
              Open this patient
            </Button>
          </div>
        </form>
      </Dialog>
    </>
  );
}
