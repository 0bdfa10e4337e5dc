'use client';

import { type FormEvent, useState } from 'react';
import { Button } from '@/components/ui/Button';
import { Field, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { authCall } from './auth';

/** Ask for the mail that lets one set a new password. The answer is the same whether the account exists or not. */
export function ForgotForm() {
  const [busy, setBusy] = useState(false);
  const [done, setDone] = useState(false);
  const [failure, setFailure] = useState<string | null>(null);
  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    setBusy(true);
    const answer = await authCall('/auth/forgot', {
      email: String(new FormData(event.currentTarget).get('email') ?? '').trim(),
    });
    setBusy(false);
    setDone(answer.ok);
    setFailure(answer.ok ? null : answer.message);
  }
  if (done)
    return (
      <Notice tone="info" title="Look at your mail" live>
        If there is an account with this address, a message is on its way. What it holds works for an hour.
      </Notice>
    );
  return (
    <form onSubmit={submit} className="grid gap-4">
      {failure ? (
        <Notice tone="alarm" title="Not sent">
          {failure}
        </Notice>
      ) : null}
      <Field label="E-mail" required>
        <TextInput name="email" type="email" autoComplete="username" autoFocus />
      </Field>
      <div>
        <Button type="submit" variant="primary" busy={busy}>
          Send the message
        </Button>
      </div>
    </form>
  );
}
