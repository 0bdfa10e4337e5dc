'use client';

import { useRouter } from 'next/navigation';
import { type FormEvent, useState } from 'react';
import { Button } from '@/components/ui/Button';
import { CopyText } from '@/components/ui/CopyText';
import { Field, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { tell } from '@/components/ui/Toast';
import { RecoveryCodes } from './RecoveryCodes';
import { fieldErrors, useAct } from './useAct';

interface Plan {
  qrSvg: string;
  secret: string;
  recoveryCodes: string[];
}

/** Set up an authenticator, or manage the one that is there. `needed`: the role asks for one. */
export function SecondFactor({ on, needed }: { on: boolean; needed: boolean }) {
  const router = useRouter();
  const [plan, setPlan] = useState<Plan | null>(null);
  const [codes, setCodes] = useState<readonly string[] | null>(null);
  if (codes)
    return (
      <div className="grid gap-4">
        <RecoveryCodes codes={codes} />
        <div>
          <Button
            variant="primary"
            onClick={() => {
              setCodes(null);
              router.refresh();
            }}
          >
            I have kept them
          </Button>
        </div>
      </div>
    );
  if (plan)
    return (
      <Confirm
        plan={plan}
        onDone={() => {
          setCodes(plan.recoveryCodes);
          setPlan(null);
          tell('The second factor is on');
        }}
      />
    );
  if (on) return <Manage needed={needed} onCodes={setCodes} />;
  return (
    <div className="grid gap-4">
      {needed ? (
        <Notice tone="care" title="Your role needs a second factor">
          Set up an authenticator on your phone first. Until then nothing else opens.
        </Notice>
      ) : (
        <p className="max-w-line">
          An authenticator on your phone gives a code at every sign-in, so that your password alone opens
          nothing.
        </p>
      )}
      <WithPassword<Plan>
        url="/api/account/second-factor"
        label="Set up an authenticator"
        variant="primary"
        onDone={setPlan}
      />
    </div>
  );
}

function Manage({ needed, onCodes }: { needed: boolean; onCodes: (codes: string[]) => void }) {
  const router = useRouter();
  const [open, setOpen] = useState<'codes' | 'remove' | null>(null);
  return (
    <div className="grid gap-4">
      <Notice tone="good" title="On">
        A code of your authenticator is asked for at every sign-in.
      </Notice>
      {open === null ? (
        <div className="flex flex-wrap gap-3">
          <Button onClick={() => setOpen('codes')}>New recovery codes</Button>
          <Button variant="danger" onClick={() => setOpen('remove')}>
            {needed ? 'Move to another phone' : 'Remove it'}
          </Button>
        </div>
      ) : null}
      {open === 'codes' ? (
        <WithPassword<{ recoveryCodes: string[] }>
          url="/api/account/recovery-codes"
          label="Make ten new codes"
          help="The codes that you have now stop working."
          onDone={({ recoveryCodes }) => onCodes(recoveryCodes)}
          onLeave={() => setOpen(null)}
        />
      ) : null}
      {open === 'remove' ? (
        <WithPassword
          url="/api/account/second-factor/remove"
          label="Remove the authenticator"
          variant="danger"
          help={
            needed
              ? 'Your role needs one: set up the other phone right after this.'
              : 'Your password alone signs you in then.'
          }
          onDone={() => {
            tell('The second factor is removed');
            setOpen(null);
            router.refresh();
          }}
          onLeave={() => setOpen(null)}
        />
      ) : null}
    </div>
  );
}

interface WithPasswordProps<T> {
  url: string;
  label: string;
  help?: string;
  variant?: 'primary' | 'plain' | 'danger';
  onDone: (answer: T) => void;
  onLeave?: () => void;
}

/** An act that asks for the password again. */
function WithPassword<T>({ url, label, help, variant = 'plain', onDone, onLeave }: WithPasswordProps<T>) {
  const { act, busy, failure } = useAct<T>(url);
  const errors = fieldErrors(failure);
  const submit = async (event: FormEvent<HTMLFormElement>) => {
    event.preventDefault();
    const password = String(new FormData(event.currentTarget).get('password') ?? '');
    const answer = await act({ password });
    if (answer) onDone(answer);
  };
  return (
    <form onSubmit={submit} className="grid max-w-[560px] gap-4">
      {failure && !errors.password ? (
        <Notice tone="alarm" title="Not done">
          {failure.message}
        </Notice>
      ) : null}
      <Field label="Your password" required {...(help ? { help } : {})} error={errors.password}>
        <TextInput name="password" type="password" autoComplete="current-password" />
      </Field>
      <div className="flex flex-wrap gap-3">
        <Button type="submit" variant={variant} busy={busy}>
          {label}
        </Button>
        {onLeave ? <Button onClick={onLeave}>Leave it as it is</Button> : null}
      </div>
    </form>
  );
}

function Confirm({ plan, onDone }: { plan: Plan; onDone: () => void }) {
  const { act, busy, failure } = useAct('/api/account/second-factor/confirm');
  const errors = fieldErrors(failure);
  const submit = async (event: FormEvent<HTMLFormElement>) => {
    event.preventDefault();
    const code = String(new FormData(event.currentTarget).get('code') ?? '');
    if (await act({ code })) onDone();
  };
  return (
    <form onSubmit={submit} className="grid gap-4">
      <p className="max-w-line">
        Scan this with an authenticator, or type the secret into it. Then enter the code that it shows.
      </p>
      {/* Black on white whatever the theme: scanners want it so. */}
      {/* biome-ignore lint/performance/noImgElement: drawn by our own server, in the answer itself */}
      <img
        src={`data:image/svg+xml;utf8,${encodeURIComponent(plan.qrSvg)}`}
        alt="QR code with the secret for the authenticator; the same is below as text"
        width={220}
        height={220}
        className="rounded-plate border border-line"
      />
      <CopyText text={plan.secret} what="secret" shown={plan.secret.match(/.{1,4}/g)?.join(' ') ?? ''} />
      {failure && !errors.code ? (
        <Notice tone="alarm" title="Not set up">
          {failure.message}
        </Notice>
      ) : null}
      <Field label="Code" help="Six digits." required error={errors.code} className="max-w-[560px]">
        <TextInput name="code" mono inputMode="numeric" autoComplete="one-time-code" pattern="[0-9 ]{6,7}" />
      </Field>
      <div>
        <Button type="submit" variant="primary" busy={busy}>
          Turn the second factor on
        </Button>
      </div>
    </form>
  );
}
