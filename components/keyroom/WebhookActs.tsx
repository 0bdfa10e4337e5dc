'use client';

import { useRouter } from 'next/navigation';
import { useState } from 'react';
import { sendJson } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { ConfirmDialog } from '@/components/ui/ConfirmDialog';
import { Notice } from '@/components/ui/Notice';
import { tell } from '@/components/ui/Toast';
import { ShownOnce } from './ShownOnce';

type Asked = 'rotate' | 'rotate-now' | 'remove';

/** What can be done about one webhook. */
export function WebhookActs({
  id,
  name,
  paused,
  version,
}: {
  id: string;
  name: string;
  paused: boolean;
  version: number;
}) {
  const router = useRouter();
  const [busy, setBusy] = useState<'test' | 'pause' | null>(null);
  const [failure, setFailure] = useState<string | null>(null);
  const [asked, setAsked] = useState<Asked | null>(null);
  const [secret, setSecret] = useState<{ text: string | null } | null>(null);
  const send = <T,>(act: string, body: unknown) =>
    sendJson<T>(`/api/webhooks/${id}/${act}`, body, crypto.randomUUID());
  async function press(which: 'test' | 'pause', work: () => Promise<void>) {
    setBusy(which);
    setFailure(null);
    try {
      await work();
    } catch (error) {
      setFailure(error instanceof Error ? error.message : 'It was not done. Try again.');
    }
    setBusy(null);
    router.refresh();
  }
  const test = async () => {
    const { ok, failure: why } = await send<{ ok: boolean; failure: string | null }>('test', {});
    if (ok) tell('The test event was taken');
    else setFailure(`The test event was not taken: ${why ?? 'no answer'}`);
  };
  const pause = async () => {
    await send('pause', { paused: !paused, version });
    tell(paused ? 'Deliveries go on' : 'Deliveries are held back', paused ? undefined : 'Nothing is lost.');
  };
  const confirm = async (reason: string) => {
    if (asked === 'remove') {
      await send('remove', { version, reason });
      tell(`${name} is told no more`);
      router.push('/keyroom/webhooks');
      return;
    }
    const answer = await send<{ secret: string | null }>('rotate', {
      version,
      atOnce: asked === 'rotate-now',
    });
    setSecret({ text: answer.secret });
    router.refresh();
  };
  return (
    <div className="grid gap-3">
      <div className="flex flex-wrap gap-3">
        <Button busy={busy === 'test'} busyLabel="Sending" onClick={() => void press('test', test)}>
          Send a test event
        </Button>
        <Button busy={busy === 'pause'} onClick={() => void press('pause', pause)}>
          {paused ? 'Let deliveries go on' : 'Hold deliveries back'}
        </Button>
        <Button onClick={() => setAsked('rotate')}>Rotate the secret…</Button>
        <Button variant="danger" onClick={() => setAsked('remove')}>
          Remove…
        </Button>
      </div>
      {failure ? <Notice tone="alarm">{failure}</Notice> : null}
      <ConfirmDialog
        open={asked !== null}
        onOpenChange={(open) => (open ? undefined : setAsked(null))}
        title={asked === 'remove' ? `Remove ${name}` : `Rotate the secret of ${name}`}
        confirmLabel={asked === 'remove' ? 'Remove the webhook' : 'Make a new secret'}
        danger={asked !== 'rotate'}
        {...(asked === 'remove' ? { reason: { label: 'Reason' } } : {})}
        onConfirm={({ reason }) => confirm(reason)}
      >
        {asked === 'remove' ? (
          <p>It is told nothing more, and what waits for it is not delivered.</p>
        ) : (
          <>
            <p>
              {asked === 'rotate'
                ? 'For a day each delivery is signed with both secrets, so that nothing is refused.'
                : 'From now on only the new secret signs: the receiver refuses everything until it has it.'}
            </p>
            <p>
              <Button variant="quiet" onClick={() => setAsked(asked === 'rotate' ? 'rotate-now' : 'rotate')}>
                {asked === 'rotate' ? 'It is known to somebody: stop it at once' : 'Let both sign for a day'}
              </Button>
            </p>
          </>
        )}
      </ConfirmDialog>
      <ShownOnce
        title="The new secret"
        parts={secret === null ? null : [{ label: 'Secret', what: 'secret', text: secret.text }]}
        onClose={() => setSecret(null)}
      />
    </div>
  );
}
