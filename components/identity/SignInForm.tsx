'use client';

import Link from 'next/link';
import { type FormEvent, useState } from 'react';
import { Button } from '@/components/ui/Button';
import { Field, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { type AuthAnswer, authCall } from './auth';

type Step = 'password' | 'code' | 'recovery';

function send(step: Step, form: FormData): Promise<AuthAnswer> {
  const value = (name: string) => String(form.get(name) ?? '');
  if (step === 'password')
    return authCall('/auth/sign-in', { email: value('email').trim(), password: value('password') });
  if (step === 'code') return authCall('/auth/authenticator', { code: value('code') });
  return authCall('/auth/recovery-code', { code: value('recovery').trim() });
}

/** E-mail and password, then the second factor where there is one. */
export function SignInForm({ next }: { next: string }) {
  const [step, setStep] = useState<Step>('password');
  const [busy, setBusy] = useState(false);
  const [failure, setFailure] = useState<string | null>(null);

  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    setBusy(true);
    setFailure(null);
    const answer = await send(step, new FormData(event.currentTarget));
    if (answer.ok && answer.data.next === 'in') {
      // A whole load: everything that was drawn for somebody else is gone.
      window.location.assign(next);
      return;
    }
    setBusy(false);
    if (answer.ok) return setStep('code');
    const unknown = answer.status === 401 && step === 'password';
    setFailure(unknown ? 'E-mail and password do not belong together.' : answer.message);
    if (answer.members.startAgain === true) setStep('password');
  }

  return (
    <form onSubmit={submit} className="grid gap-4" method="post">
      <h1>{step === 'password' ? 'Sign in' : 'Second factor'}</h1>
      {failure ? (
        <Notice tone="alarm" title="Not signed in">
          {failure}
        </Notice>
      ) : null}
      <Fields step={step} />
      <div className="flex flex-wrap items-center gap-4">
        <Button type="submit" variant="primary" busy={busy} busyLabel="Signing in">
          {step === 'password' ? 'Sign in' : 'Go on'}
        </Button>
        <OtherWay step={step} onStep={setStep} />
      </div>
    </form>
  );
}

function Fields({ step }: { step: Step }) {
  if (step === 'code')
    return (
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
    );
  if (step === 'recovery')
    return (
      <Field key="recovery" label="Recovery code" help="Each one works once." required>
        <TextInput name="recovery" autoComplete="off" autoFocus mono />
      </Field>
    );
  return (
    <>
      <Field label="E-mail" required>
        <TextInput name="email" type="email" autoComplete="username" autoFocus inputMode="email" />
      </Field>
      <Field label="Password" required>
        <TextInput name="password" type="password" autoComplete="current-password" />
      </Field>
    </>
  );
}

function OtherWay({ step, onStep }: { step: Step; onStep: (step: Step) => void }) {
  if (step === 'password')
    return (
      <Link href="/forgot" className="link">
        Set a new password
      </Link>
    );
  return (
    <Button variant="quiet" onClick={() => onStep(step === 'code' ? 'recovery' : 'code')}>
      {step === 'code' ? 'Use a recovery code' : 'Use the authenticator'}
    </Button>
  );
}
