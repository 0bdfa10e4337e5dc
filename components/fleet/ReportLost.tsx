'use client';

import { useRouter } from 'next/navigation';
import { type FormEvent, useId, useState } from 'react';
import { fieldErrors, useAct } from '@/components/identity/useAct';
import { Button } from '@/components/ui/Button';
import { Dialog } from '@/components/ui/Dialog';
import { Field, Textarea, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { tell } from '@/components/ui/Toast';

/** Report a device lost: when it was last surely in hand, and why it is thought lost. */
export function ReportLost({
  deviceId,
  assetTag,
  version,
}: {
  deviceId: string;
  assetTag: string;
  version: number;
}) {
  const [open, setOpen] = useState(false);
  const formId = useId();
  const router = useRouter();
  const { act, busy, failure } = useAct<{ sentSince: number }>(`/api/devices/${deviceId}/lost`);
  const errors = fieldErrors(failure);
  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    const form = new FormData(event.currentTarget);
    const lastInHandAt = new Date(String(form.get('lastInHandAt'))).getTime();
    const answer = await act({ lastInHandAt, reason: form.get('reason'), version });
    if (!answer) return;
    setOpen(false);
    tell(`${assetTag} is lost; it sent ${answer.sentSince} since it was last in hand`);
    router.push(`/devices/${deviceId}?since=${lastInHandAt}`);
    router.refresh();
  }
  return (
    <>
      <Button size="small" variant="danger" onClick={() => setOpen(true)}>
        It is lost…
      </Button>
      <Dialog
        open={open}
        onOpenChange={busy ? () => undefined : setOpen}
        title={`${assetTag} is lost`}
        description="Its credentials are revoked, its upload slots closed and its listening session ended, all at once. Biomedical engineering is told by mail. Found again, it must be enrolled again."
        footer={
          <>
            <Button onClick={() => setOpen(false)} disabled={busy}>
              Leave it as it is
            </Button>
            <Button type="submit" form={formId} variant="danger" busy={busy}>
              Report it lost
            </Button>
          </>
        }
      >
        <form id={formId} onSubmit={submit} className="grid gap-4">
          {failure && Object.keys(errors).length === 0 ? (
            <Notice tone="alarm" title={failure.title}>
              {failure.message}
            </Notice>
          ) : null}
          <Field
            label="Last surely in hand"
            help="What it sent since is listed, to be looked at. By the clock of this computer."
            required
            error={errors.lastInHandAt}
          >
            <TextInput name="lastInHandAt" type="datetime-local" required />
          </Field>
          <Field
            label="Reason"
            help="It stands in the custody thread with your name."
            required
            error={errors.reason}
          >
            <Textarea name="reason" rows={2} maxLength={500} />
          </Field>
        </form>
      </Dialog>
    </>
  );
}
