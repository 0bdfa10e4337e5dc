'use client';

import { type FormEvent, useRef } from 'react';
import { Button } from '@/components/ui/Button';
import { ErrorSummary } from '@/components/ui/ErrorSummary';
import { Field, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { tell } from '@/components/ui/Toast';
import { PASSWORD_HELP } from './NewPasswordForm';
import { fieldErrors, useAct } from './useAct';

/** One's own new password. All other sessions end. */
export function ChangePasswordForm({ email }: { email: string }) {
  const form = useRef<HTMLFormElement>(null);
  const { act, busy, failure } = useAct<{ sessionsEnded: number }>('/api/account/password');
  const errors = fieldErrors(failure);
  const submit = async (event: FormEvent<HTMLFormElement>) => {
    event.preventDefault();
    const fields = new FormData(event.currentTarget);
    const answer = await act({
      current: String(fields.get('current') ?? ''),
      fresh: String(fields.get('fresh') ?? ''),
    });
    if (!answer) return;
    form.current?.reset();
    tell(
      'The new password is set',
      answer.sessionsEnded > 0 ? 'Your other sessions were ended.' : 'A mail tells you so.',
    );
  };
  const summary = Object.entries(errors).map(([path, message]) => ({ id: `password-${path}`, message }));
  return (
    <form ref={form} onSubmit={submit} className="grid max-w-[560px] gap-4">
      {summary.length > 0 ? (
        <ErrorSummary errors={summary} />
      ) : failure ? (
        <Notice tone="alarm" title="Not changed">
          {failure.message}
        </Notice>
      ) : null}
      <input type="email" name="username" value={email} autoComplete="username" readOnly hidden />
      <Field id="password-current" label="Present password" required error={errors.current}>
        <TextInput name="current" type="password" autoComplete="current-password" />
      </Field>
      <Field id="password-fresh" label="New password" help={PASSWORD_HELP} required error={errors.fresh}>
        <TextInput name="fresh" type="password" autoComplete="new-password" minLength={12} maxLength={128} />
      </Field>
      <div>
        <Button type="submit" busy={busy}>
          Change the password
        </Button>
      </div>
    </form>
  );
}
