'use client';

import Link from 'next/link';
import { type FormEvent, useState } from 'react';
import { Button, buttonClass } from '@/components/ui/Button';
import { Field, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { type AuthAnswer, authCall } from './auth';
import { passkeyAnswer } from './browserPasskey';

export type SignInStep = 'password' | 'code' | 'recovery' | 'passkey';

function send(step: SignInStep, form: FormData): Promise<AuthAnswer> {
  const value = (name: string) => String(form.get(name) ?? '');
  if (step === 'password')
    return authCall('/auth/sign-in', { email: value('email').trim(), password: value('password') });
  if (step === 'code') return authCall('/auth/authenticator', { code: value('code') });
  return authCall('/auth/recovery-code', { code: value('recovery').trim() });
}

/** The browser's own dialogue, and what the service says to it. */
async function sendPasskey(): Promise<AuthAnswer> {
  const begun = await authCall('/auth/passkey/options', {});
  if (!begun.ok) return begun;
  const answer = await passkeyAnswer(begun.data.options);
  if (answer === null)
    return {
      ok: false,
      status: 0,
      message: 'No passkey was shown. Try again, or use your password.',
      members: {},
    };
  return await authCall('/auth/passkey', { handle: begun.data.handle, answer });
}

const TITLES: Record<SignInStep, string> = {
  password: 'Sign in',
  code: 'Second factor',
  recovery: 'Second factor',
  passkey: 'Passkey',
};

interface SignInFormProps {
  next: string;
  /** Where a way through the hospital's account goes on. */
  first: SignInStep;
  notice: string | null;
  /** Name of the hospital's account, where single sign-on is set up. */
  signOn: string | null;
  /** Browsers make passkeys for this address. */
  passkeys: boolean;
}

/** E-mail and password and the second factor, a passkey, or the hospital's account. */
export function SignInForm({ next, first, notice, signOn, passkeys }: SignInFormProps) {
  const [step, setStep] = useState<SignInStep>(first);
  const [busy, setBusy] = useState<'form' | 'passkey' | null>(null);
  const [failure, setFailure] = useState<string | null>(notice);

  async function go(how: 'form' | 'passkey', work: () => Promise<AuthAnswer>) {
    setBusy(how);
    setFailure(null);
    const answer = await work();
    if (answer.ok && answer.data.next === 'in') {
      // A whole load: everything that was drawn for somebody else is gone.
      window.location.assign(next);
      return;
    }
    setBusy(null);
    if (answer.ok) return setStep(answer.data.next === 'passkey' ? 'passkey' : 'code');
    const unknown = answer.status === 401 && step === 'password' && how === 'form';
    setFailure(unknown ? 'E-mail and password do not belong together.' : answer.message);
    if (answer.members.startAgain === true) setStep('password');
  }
  const submit = (event: FormEvent<HTMLFormElement>) => {
    event.preventDefault();
    const form = new FormData(event.currentTarget);
    void go(step === 'passkey' ? 'passkey' : 'form', () =>
      step === 'passkey' ? sendPasskey() : send(step, form),
    );
  };

  return (
    <div className="grid gap-6">
      <form onSubmit={submit} className="grid gap-4" method="post">
        <h1>{TITLES[step]}</h1>
        {failure ? (
          <Notice tone="alarm" title="Not signed in">
            {failure}
          </Notice>
        ) : null}
        <Fields step={step} />
        <div className="flex flex-wrap items-center gap-4">
          <Button
            type="submit"
            variant="primary"
            busy={busy === 'form' || (busy === 'passkey' && step === 'passkey')}
            busyLabel="Signing in"
          >
            {step === 'password' ? 'Sign in' : step === 'passkey' ? 'Show the passkey' : 'Go on'}
          </Button>
          <OtherWay step={step} onStep={setStep} />
        </div>
      </form>
      {step === 'password' && (passkeys || signOn) ? (
        <div className="flex flex-wrap gap-3 border-t border-line pt-5">
          {passkeys ? (
            <Button busy={busy === 'passkey'} onClick={() => void go('passkey', sendPasskey)}>
              Use a passkey
            </Button>
          ) : null}
          {signOn ? (
            // A route and not a page: the browser itself must go there.
            <a
              href={`/api/auth/single-sign-on?next=${encodeURIComponent(next)}`}
              className={buttonClass('plain')}
            >
              Use {signOn}
            </a>
          ) : null}
        </div>
      ) : null}
    </div>
  );
}

function Fields({ step }: { step: SignInStep }) {
  if (step === 'passkey')
    return <p>Your account asks for the passkey that you added. Have the device with it at hand.</p>;
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

function OtherWay({ step, onStep }: { step: SignInStep; onStep: (step: SignInStep) => void }) {
  if (step === 'password')
    return (
      <Link href="/forgot" className="link">
        Set a new password
      </Link>
    );
  if (step === 'passkey')
    return (
      <Button variant="quiet" onClick={() => onStep('password')}>
        Start again
      </Button>
    );
  return (
    <Button variant="quiet" onClick={() => onStep(step === 'code' ? 'recovery' : 'code')}>
      {step === 'code' ? 'Use a recovery code' : 'Use the authenticator'}
    </Button>
  );
}
