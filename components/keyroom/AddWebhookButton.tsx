'use client';

import { useRouter } from 'next/navigation';
import { type FormEvent, useId, useState } from 'react';
import { fieldErrors, useAct } from '@/components/identity/useAct';
import { Button } from '@/components/ui/Button';
import { Checkbox, FieldSet } from '@/components/ui/Checkbox';
import { Dialog } from '@/components/ui/Dialog';
import { Field, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { EVENTS } from '@/lib/contract/events';
import { ShownOnce } from './ShownOnce';

interface Added {
  id: string;
  secret: string | null;
}

/** Tell another system what happens: the primary action of the page. */
export function AddWebhookButton() {
  const [open, setOpen] = useState(false);
  const [added, setAdded] = useState<Added | null>(null);
  const formId = useId();
  const router = useRouter();
  const { act, busy, failure } = useAct<Added>('/api/webhooks');
  const errors = fieldErrors(failure);
  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    const form = new FormData(event.currentTarget);
    const answer = await act({
      name: form.get('name'),
      url: form.get('url'),
      events: form.getAll('event'),
    });
    if (!answer) return;
    setOpen(false);
    setAdded(answer);
    router.refresh();
  }
  return (
    <>
      <Button variant="primary" onClick={() => setOpen(true)}>
        Add a webhook
      </Button>
      <Dialog
        open={open}
        onOpenChange={busy ? () => undefined : setOpen}
        title="Add a webhook"
        description="An address of another system is told what happens, signed, with no patient in it."
        footer={
          <>
            <Button onClick={() => setOpen(false)} disabled={busy}>
              Leave it
            </Button>
            <Button type="submit" form={formId} variant="primary" busy={busy}>
              Add the webhook
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
          <Field label="Name" required error={errors.name}>
            <TextInput name="name" maxLength={80} autoComplete="off" />
          </Field>
          <Field
            label="Address"
            help="https, outside the house unless the settings name its range."
            required
            error={errors.url}
          >
            <TextInput name="url" type="url" mono maxLength={1000} autoComplete="off" />
          </Field>
          <FieldSet legend="It is told when" error={errors.events}>
            {Object.entries(EVENTS).map(([type, about]) => (
              <Checkbox key={type} name="event" value={type} label={about} help={type} />
            ))}
          </FieldSet>
        </form>
      </Dialog>
      <ShownOnce
        title="The webhook is added"
        parts={
          added === null
            ? null
            : [{ label: 'Secret it checks signatures with', what: 'secret', text: added.secret }]
        }
        onClose={() => setAdded(null)}
      />
    </>
  );
}
