'use client';

import { useRouter } from 'next/navigation';
import { type FormEvent, useId, useState } from 'react';
import { fieldErrors, useAct } from '@/components/identity/useAct';
import { Button } from '@/components/ui/Button';
import { Checkbox, FieldSet } from '@/components/ui/Checkbox';
import { Dialog } from '@/components/ui/Dialog';
import { Field, Textarea, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { SCOPES } from '@/lib/contract/scopes';
import { ShownOnce } from './ShownOnce';

interface Created {
  clientId: string;
  secret: string | null;
}

const NO_KEYS = 'This is no key set in JSON: {"keys": [ … ]}.';

/** Let another system read: the primary action of the page. */
export function NewClientButton() {
  const [open, setOpen] = useState(false);
  const [created, setCreated] = useState<Created | null>(null);
  const [ownKeys, setOwnKeys] = useState(false);
  const [keysError, setKeysError] = useState<string | null>(null);
  const formId = useId();
  const router = useRouter();
  const { act, busy, failure } = useAct<Created>('/api/clients');
  const errors = fieldErrors(failure);
  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    const form = new FormData(event.currentTarget);
    let publicKeys: unknown = null;
    setKeysError(null);
    if (ownKeys) {
      try {
        publicKeys = JSON.parse(String(form.get('publicKeys')));
      } catch {
        return setKeysError(NO_KEYS);
      }
    }
    const answer = await act({ name: form.get('name'), scopes: form.getAll('scope'), publicKeys });
    if (!answer) return;
    setOpen(false);
    setCreated(answer);
    router.refresh();
  }
  return (
    <>
      <Button variant="primary" onClick={() => setOpen(true)}>
        Add an API client
      </Button>
      <Dialog
        open={open}
        onOpenChange={busy ? () => undefined : setOpen}
        title="Add an API client"
        description="Another system gets a token of its own and reads what its scopes allow."
        footer={
          <>
            <Button onClick={() => setOpen(false)} disabled={busy}>
              Leave it
            </Button>
            <Button type="submit" form={formId} variant="primary" busy={busy}>
              Add the client
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
          <Field label="Name" help="Which system it is." required error={errors.name}>
            <TextInput name="name" maxLength={80} autoComplete="off" />
          </Field>
          <FieldSet legend="It may read" error={errors.scopes}>
            {Object.entries(SCOPES).map(([scope, about]) => (
              <Checkbox key={scope} name="scope" value={scope} label={scope} help={about} />
            ))}
          </FieldSet>
          <Checkbox
            label="It signs in with keys of its own"
            help="private_key_jwt (RFC 7523): no secret is made. Stronger, where the other system can."
            checked={ownKeys}
            onChange={(event) => setOwnKeys(event.target.checked)}
          />
          {ownKeys ? (
            <Field
              label="Its public keys"
              help="A key set (RFC 7517): P-256, Ed25519 or RSA."
              required
              error={keysError ?? errors.publicKeys}
            >
              <Textarea name="publicKeys" rows={6} className="font-mono" spellCheck={false} />
            </Field>
          ) : null}
        </form>
      </Dialog>
      <ShownOnce
        title="The client is added"
        parts={
          created === null
            ? null
            : [
                { label: 'Client id', what: 'client id', text: created.clientId },
                ...(ownKeys ? [] : [{ label: 'Secret', what: 'secret', text: created.secret }]),
              ]
        }
        onClose={() => setCreated(null)}
      />
    </>
  );
}
