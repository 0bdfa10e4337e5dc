'use client';

import Link from 'next/link';
import { type FormEvent, useState } from 'react';
import { Button } from '@/components/ui/Button';
import { Field, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { authCall } from './auth';

type Step = 'password' | 'code' | 'recovery';

/** E-mail and password, then the second factor where there is one. */
export function SignInForm({ next }: { next: string }) {
  const [step, setStep] = useState<Step>('password');
  const [busy, setBusy] = useState(false);
  const [failure, setFailure] = useState<string | null>(null);

  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    const form = new FormData(event.currentTarget);
    const value = (name: string) => String(form.get(name) ?? '').trim();
    setBusy(true);
    setFailure(null);
    const answer =
      step === 'password'
        ? await authCall('/auth/sign-in', {
            email: value('email'),
            password: String(form.get('password') ?? ''),
          })
        : step === 'code'
          ? await authCall('/auth/authenticator', { code: value('code') })
          : await authCall('/auth/recovery-code', { code: value('recovery') });
    if (!answer.ok) {
      setBusy(false);
      setFailure(
        answer.status === 401 && step === 'password'
          ? 'E-mail and password do not belong together.'
          : answer.message,
      );
      if (answer.members.startAgain === true) setStep('password');
      return;
    }
    if (answer.data.next === 'second-factor') {
      setBusy(false);
      setStep('code');
      return;
    }
    // A whole load: everything that was drawn for somebody else is gone.
    window.location.assign(next);
  }

  return (
    <form onSubmit={submit} className="grid gap-4" method="post">
      <h1>{step === 'password' ? 'Sign in' : 'Second factor'}</h1>
      {failure ? (
        <Notice tone="alarm" title="Not signed in">
          {failure}
        </Notice>
      ) : null}
      {step === 'password' ? (
        <>
          <Field label="E-mail" required>
            <TextInput name="email" type="email" autoComplete="username" autoFocus inputMode="email" />
          </Field>
          <Field label="Password" required>
            <TextInput name="password" type="password" autoComplete="current-password" />
          </Field>
        </>
      ) : null}
      {step === 'code' ? (
        <Field key="code" label="Code" help="Six digits from your authenticator." required>
          <TextInput
            name="code"
            inputMode="numeric"
            autoComplete="one-time-code"
            pattern="[0-9 ]{6,7}"
            autoFocus
            mono
          />
        </Field>
      ) : null}
      {step === 'recovery' ? (
        <Field key="recovery" label="Recovery code" help="Each one works once." required>
          <TextInput name="recovery" autoComplete="off" autoFocus mono />
        </Field>
      ) : null}
      <div className="flex flex-wrap items-center gap-4">
        <Button type="submit" variant="primary" busy={busy} busyLabel="Signing in">
          {step === 'password' ? 'Sign in' : 'Go on'}
        </Button>
        {step === 'password' ? (
          <Link href="/forgot" className="link">
            Set a new password
          </Link>
        ) : null}
        {step === 'code' ? (
          <Button variant="quiet" onClick={() => setStep('recovery')}>
            Use a recovery code
          </Button>
        ) : null}
        {step === 'recovery' ? (
          <Button variant="quiet" onClick={() => setStep('code')}>
            Use the authenticator
          </Button>
        ) : null}
      </div>
    </form>
  );
}
