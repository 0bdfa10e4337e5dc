'use client';

import Link from 'next/link';
import { type FormEvent, useState } from 'react';
import { Button } from '@/components/ui/Button';
import { Field, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { authCall } from './auth';

export const PASSWORD_HELP =
  'At least 12 characters. Three or four words that have nothing to do with each other are easy to keep.';

/** A new password by the token that came by mail. All sessions of the account end. */
export function NewPasswordForm({ token }: { token: string }) {
  const [busy, setBusy] = useState(false);
  const [done, setDone] = useState(false);
  const [failure, setFailure] = useState<string | null>(null);
  const [gone, setGone] = useState(false);
  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    setBusy(true);
    const answer = await authCall('/auth/reset', {
      token,
      newPassword: String(new FormData(event.currentTarget).get('password') ?? ''),
    });
    setBusy(false);
    setDone(answer.ok);
    setFailure(answer.ok ? null : answer.message);
    setGone(!answer.ok && answer.status === 404);
  }
  if (done)
    return (
      <Notice tone="good" title="The new password is set" live>
        All your sessions were ended. <Link href="/sign-in">Sign in</Link> with it.
      </Notice>
    );
  return (
    <form onSubmit={submit} className="grid gap-4">
      {failure ? (
        <Notice tone="alarm" title="Not set">
          {failure} {gone ? <Link href="/forgot">Ask for another</Link> : null}
        </Notice>
      ) : null}
      <Field label="New password" help={PASSWORD_HELP} required>
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
        <Button type="submit" variant="primary" busy={busy}>
          Set the new password
        </Button>
      </div>
    </form>
  );
}
