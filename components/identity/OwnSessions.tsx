'use client';

import { useRouter } from 'next/navigation';
import { useState } from 'react';
import { concerns } from '@/components/shell/LiveEvents';
import { sendJson, useData } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { Notice } from '@/components/ui/Notice';
import { tell } from '@/components/ui/Toast';
import { type SessionLine, SessionsTable } from './SessionsTable';

export interface OwnSessionsAnswer {
  sessions: SessionLine[];
  current: string;
}

/** Where one is signed in, and how to end what one does not know. */
export function OwnSessions({ first, personId }: { first: OwnSessionsAnswer; personId: string }) {
  const router = useRouter();
  const [failure, setFailure] = useState<string | null>(null);
  const { data, mutate } = useData<OwnSessionsAnswer>('/api/account/sessions', first, (event) =>
    concerns(event, 'person', personId),
  );
  const { sessions, current } = data ?? first;
  const end = async (which: { id: string } | { others: true }, done: string) => {
    setFailure(null);
    try {
      await sendJson('/api/account/sessions/end', which, crypto.randomUUID());
      tell(done);
    } catch (error) {
      setFailure(error instanceof Error ? error.message : 'It was not ended. Try again.');
    }
    await mutate();
    router.refresh();
  };
  return (
    <div className="grid gap-3">
      {failure ? <Notice tone="alarm">{failure}</Notice> : null}
      <SessionsTable
        sessions={sessions}
        act={(line) =>
          line.id === current ? (
            <span className="text-ink-soft">this one</span>
          ) : (
            <Button
              size="small"
              variant="danger"
              onClick={() => end({ id: line.id }, 'The session is ended')}
            >
              End it
            </Button>
          )
        }
      />
      {sessions.length > 1 ? (
        <div>
          <Button variant="danger" onClick={() => end({ others: true }, 'All other sessions are ended')}>
            End all others
          </Button>
        </div>
      ) : null}
    </div>
  );
}
