'use client';

import { useRouter } from 'next/navigation';
import { type FormEvent, useState } from 'react';
import { Button } from '@/components/ui/Button';
import { Field, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { Time } from '@/components/ui/Time';
import { tell } from '@/components/ui/Toast';
import { makePasskey } from './browserPasskey';
import { fieldErrors, useAct } from './useAct';

export interface PasskeyLine {
  id: string;
  name: string;
  createdAt: number;
  lastUsedAt: number | null;
}

/** One's own passkeys: add one, take one away. */
export function Passkeys({
  passkeys,
  hasPassword,
}: {
  passkeys: readonly PasskeyLine[];
  hasPassword: boolean;
}) {
  const [open, setOpen] = useState<{ act: 'add' } | { act: 'remove'; line: PasskeyLine } | null>(null);
  return (
    <div className="grid gap-4">
      <p className="max-w-line">
        A passkey on your phone, computer or security key signs you in without a password or a code.
      </p>
      {passkeys.length > 0 ? (
        <ul className="grid gap-2">
          {passkeys.map((line) => (
            <li
              key={line.id}
              className="flex flex-wrap items-center justify-between gap-x-4 gap-y-1 border-b border-line pb-2"
            >
              <span className="min-w-0">
                <b className="break-words">{line.name}</b>{' '}
                <span className="text-ink-soft">
                  added <Time at={line.createdAt} mode="date" />, last used{' '}
                  <Time at={line.lastUsedAt} ago never="not yet" />
                </span>
              </span>
              <Button
                size="small"
                variant="danger"
                aria-label={`Remove the passkey ${line.name}`}
                onClick={() => setOpen({ act: 'remove', line })}
              >
                Remove…
              </Button>
            </li>
          ))}
        </ul>
      ) : null}
      {open === null ? (
        <div>
          <Button
            variant={passkeys.length === 0 ? 'primary' : 'plain'}
            onClick={() => setOpen({ act: 'add' })}
          >
            Add a passkey
          </Button>
        </div>
      ) : open.act === 'add' ? (
        <AddPasskey hasPassword={hasPassword} onClose={() => setOpen(null)} />
      ) : (
        <RemovePasskey line={open.line} hasPassword={hasPassword} onClose={() => setOpen(null)} />
      )}
    </div>
  );
}

interface FormProps {
  hasPassword: boolean;
  onClose: () => void;
}

const passwordOf = (form: FormData) => {
  const password = String(form.get('password') ?? '');
  return password === '' ? {} : { password };
};

function PasswordField({ error }: { error: string | undefined }) {
  return (
    <Field label="Your password" required error={error}>
      <TextInput name="password" type="password" autoComplete="current-password" />
    </Field>
  );
}

function AddPasskey({ hasPassword, onClose }: FormProps) {
  const router = useRouter();
  const begin = useAct<{ handle: string; options: unknown }>('/api/account/passkeys/options');
  const keep = useAct<{ id: string }>('/api/account/passkeys');
  const [declined, setDeclined] = useState(false);
  const failure = keep.failure ?? begin.failure;
  const errors = fieldErrors(failure);
  const submit = async (event: FormEvent<HTMLFormElement>) => {
    event.preventDefault();
    setDeclined(false);
    const form = new FormData(event.currentTarget);
    const name = String(form.get('name') ?? '').trim();
    const begun = await begin.act(passwordOf(form));
    if (!begun) return;
    const answer = await makePasskey(begun.options);
    if (answer === null) return setDeclined(true);
    if (!(await keep.act({ handle: begun.handle, name, answer }))) return;
    tell(`The passkey ${name} is added`);
    onClose();
    router.refresh();
  };
  return (
    <form onSubmit={submit} className="grid max-w-[560px] gap-4">
      {declined ? (
        <Notice tone="alarm" title="Not added">
          Your browser made no passkey. Try again, or use another device.
        </Notice>
      ) : failure && Object.keys(errors).length === 0 ? (
        <Notice tone="alarm" title="Not added">
          {failure.message}
        </Notice>
      ) : null}
      <Field label="Name" help="So that you know it again: “My phone”." required error={errors.name}>
        <TextInput name="name" maxLength={60} autoComplete="off" />
      </Field>
      {hasPassword ? <PasswordField error={errors.password} /> : null}
      <div className="flex flex-wrap gap-3">
        <Button type="submit" variant="primary" busy={begin.busy || keep.busy}>
          Make the passkey
        </Button>
        <Button onClick={onClose}>Leave it as it is</Button>
      </div>
    </form>
  );
}

function RemovePasskey({ line, hasPassword, onClose }: FormProps & { line: PasskeyLine }) {
  const router = useRouter();
  const { act, busy, failure } = useAct(`/api/account/passkeys/${encodeURIComponent(line.id)}/remove`);
  const errors = fieldErrors(failure);
  const submit = async (event: FormEvent<HTMLFormElement>) => {
    event.preventDefault();
    if (!(await act(passwordOf(new FormData(event.currentTarget))))) return;
    tell(`The passkey ${line.name} is removed`);
    onClose();
    router.refresh();
  };
  return (
    <form onSubmit={submit} className="grid max-w-[560px] gap-4">
      {failure && Object.keys(errors).length === 0 ? (
        <Notice tone="alarm" title="Not removed">
          {failure.message}
        </Notice>
      ) : null}
      <p>“{line.name}” will no longer sign you in. Remove it on your device too.</p>
      {hasPassword ? <PasswordField error={errors.password} /> : null}
      <div className="flex flex-wrap gap-3">
        <Button type="submit" variant="danger" busy={busy}>
          Remove the passkey
        </Button>
        <Button onClick={onClose}>Leave it as it is</Button>
      </div>
    </form>
  );
}
