'use client';

import Link from 'next/link';
import { type FormEvent, useState } from 'react';
import { Button } from '@/components/ui/Button';
import { Field, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { authCall } from './auth';
import { PASSWORD_HELP } from './NewPasswordForm';

/** Take up an invitation: choose a password, and go in with it. */
export function AcceptForm({ token, email }: { token: string; email: string }) {
  const [busy, setBusy] = useState(false);
  const [failure, setFailure] = useState<string | null>(null);
  const [joined, setJoined] = useState(false);
  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    const password = String(new FormData(event.currentTarget).get('password') ?? '');
    setBusy(true);
    setFailure(null);
    const answer = await authCall('/invitations/accept', { token, password });
    if (!answer.ok) {
      setBusy(false);
      setFailure(answer.message);
      return;
    }
    setJoined(true);
    const inside = await authCall('/auth/sign-in', { email, password });
    if (inside.ok) window.location.assign('/');
    else setBusy(false);
  }
  if (joined)
    return (
      <Notice tone="good" title="Your account is ready" live>
        <Link href="/sign-in">Sign in</Link> with {email} and the password that you just chose.
      </Notice>
    );
  return (
    <form onSubmit={submit} method="post" className="grid gap-4">
      {failure ? (
        <Notice tone="alarm" title="Not yet">
          {failure}
        </Notice>
      ) : null}
      <Field label="E-mail">
        <TextInput name="email" type="email" value={email} autoComplete="username" readOnly />
      </Field>
      <Field label="Choose a password" help={PASSWORD_HELP} required>
        <TextInput
          name="password"
          type="password"
          autoComplete="new-password"
          minLength={12}
          maxLength={128}
          autoFocus
        />
      </Field>
      <div>
        <Button type="submit" variant="primary" busy={busy} busyLabel="Making your account">
          Make my account
        </Button>
      </div>
    </form>
  );
}
