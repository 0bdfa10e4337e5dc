'use client';

import { useRouter } from 'next/navigation';
import { useState } from 'react';
import { sendJson } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { ConfirmDialog } from '@/components/ui/ConfirmDialog';
import { tell } from '@/components/ui/Toast';

type Act = 'end-sessions' | 'remove-second-factor' | 'leave';

const WORDS: Record<Act, { button: string; confirm: string; done: string; body: (name: string) => string }> =
  {
    'end-sessions': {
      button: 'End all sessions',
      confirm: 'End the sessions',
      done: 'The sessions are ended',
      body: (name) => `${name} is signed out everywhere at once and can sign in again.`,
    },
    'remove-second-factor': {
      button: 'Remove the second factor',
      confirm: 'Remove the second factor',
      done: 'The second factor is removed',
      body: (name) =>
        `For somebody who lost both authenticator and recovery codes. Make sure that it is ${name} who asks. They are told by mail, are signed out, and an IT administrator sets up another before anything else.`,
    },
    leave: {
      button: 'Close the account',
      confirm: 'Close the account',
      done: 'The account is closed',
      body: (name) =>
        `Sessions, password, second factor, roles and wards of ${name} go at once. Everything they did stays under their name.`,
    },
  };

/** What is done to a person as a whole, each asked again before it is done. */
export function PersonActs({ id, name, acts }: { id: string; name: string; acts: readonly Act[] }) {
  const router = useRouter();
  const [act, setAct] = useState<Act | null>(null);
  return (
    <>
      {acts.map((one) => (
        <Button key={one} variant={one === 'end-sessions' ? 'plain' : 'danger'} onClick={() => setAct(one)}>
          {WORDS[one].button}
        </Button>
      ))}
      <ConfirmDialog
        open={act !== null}
        onOpenChange={(open) => (open ? undefined : setAct(null))}
        title={act ? `${WORDS[act].button}: ${name}` : ''}
        confirmLabel={act ? WORDS[act].confirm : ''}
        {...(act && act !== 'end-sessions' ? { reason: { label: 'Why' } } : {})}
        {...(act === 'leave' ? { typed: { text: name } } : {})}
        onConfirm={async ({ reason }) => {
          if (!act) return;
          const body = act === 'end-sessions' ? {} : { reason };
          await sendJson(`/api/people/${id}/${act}`, body, crypto.randomUUID());
          tell(WORDS[act].done);
          router.refresh();
        }}
      >
        <p>{act ? WORDS[act].body(name) : ''}</p>
      </ConfirmDialog>
    </>
  );
}
