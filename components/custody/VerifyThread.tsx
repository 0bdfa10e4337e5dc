'use client';

import { useEffect, useState } from 'react';
import { Button } from '@/components/ui/Button';
import { CopyText } from '@/components/ui/CopyText';
import { Notice } from '@/components/ui/Notice';
import { Panel } from '@/components/ui/Panel';
import { CHECK_IDS, type Check, type CheckedThread, type CheckId } from '@/lib/custody/pure/checkThread';
import { HeldHeadDialog } from './HeldHeadDialog';
import { InclusionPath } from './InclusionPath';
import { useThreadChecks } from './useThreadChecks';
import { publishedKeys } from './verifySources';

const TITLES: Record<CheckId, string> = {
  leaves: 'Every entry hashes to its leaf',
  signature: 'The head is signed by the published key',
  inclusion: 'Each leaf is in the head',
  consistency: 'The head follows an earlier one',
  locked: 'The head equals the locked copy in storage',
  original: 'Bytes in storage are the sealed bytes',
};
const MARKS: Record<Check['state'], { mark: string; word: string; tone: string }> = {
  waiting: { mark: '·', word: 'not yet checked', tone: 'text-ink-soft' },
  running: { mark: '…', word: 'being checked', tone: 'text-brass' },
  right: { mark: '✓', word: 'right', tone: 'text-spruce' },
  wrong: { mark: '✗', word: 'wrong', tone: 'text-rust' },
  unchecked: { mark: '–', word: 'could not be checked', tone: 'text-brass' },
};

interface Props {
  /** Of the recording whose thread it is; null for a thread of anything else. */
  number: string | null;
  /** Whether this person may open the original. */
  mayOpen: boolean;
  thread: CheckedThread;
}

/** Checks the thread in the reader's own browser, one after another, with the values that were computed. */
export function VerifyThread({ number, mayOpen, thread }: Props) {
  const { checks, seen, held, setHeld, verify } = useThreadChecks(number, mayOpen, thread);
  const [asking, setAsking] = useState(false);
  const [busy, setBusy] = useState(false);
  const all = CHECK_IDS.filter((id) => number !== null || id !== 'original').map((id) => checks[id]);
  const bad = all.filter((check) => check.state === 'wrong');
  return (
    <Panel
      flush
      title="Verify in this browser"
      aside={
        <span className="text-13 font-semibold text-brass" role="status">
          {all.filter((check) => check.state === 'right').length} of {all.length}
        </span>
      }
    >
      {bad.length > 0 ? <Alarm bad={bad} /> : null}
      <ol className="px-[18px] py-1.5">
        {all.map((check) => (
          <CheckLine key={check.id} check={check} held={held !== undefined} />
        ))}
      </ol>
      {seen.path ? <InclusionPath {...seen.path} /> : null}
      {seen.note ? (
        <pre className="max-h-[240px] overflow-auto border-t border-line bg-well px-[18px] py-3 font-mono text-13 whitespace-pre-wrap [overflow-wrap:anywhere]">
          {seen.note}
        </pre>
      ) : null}
      <div className="flex flex-wrap gap-2.5 border-t border-line px-[18px] py-3.5">
        <Button
          variant="primary"
          size="small"
          busy={busy}
          busyLabel="Verifying"
          onClick={async () => {
            setBusy(true);
            await verify();
            setBusy(false);
          }}
        >
          {mayOpen ? 'Verify with the original' : 'Verify again'}
        </Button>
        <Button size="small" onClick={() => setAsking(true)}>
          Check against a head I hold…
        </Button>
        {held !== undefined ? (
          <Button size="small" variant="quiet" onClick={() => setHeld(undefined)}>
            Let go of it
          </Button>
        ) : null}
      </div>
      {mayOpen ? (
        <p className="px-[18px] pb-3 text-13 text-ink-soft">
          Fetching the original is written in this thread.
        </p>
      ) : null}
      <PublishedKeys />
      <HeldHeadDialog open={asking} onOpenChange={setAsking} onHeld={setHeld} />
    </Panel>
  );
}

function Alarm({ bad }: { bad: readonly Check[] }) {
  return (
    <div className="p-[18px] pb-0">
      <Notice tone="alarm" title="This thread does not verify">
        <span className="[overflow-wrap:anywhere]">
          {bad.map((check) => `Not so: “${TITLES[check.id]}”. ${check.detail}`).join(' ')} Tell the auditor
          and IT before anything else is done with it.
        </span>
      </Notice>
    </div>
  );
}

/** The keys from the address that anybody reads. */
function PublishedKeys() {
  const [keys, setKeys] = useState<string[]>([]);
  useEffect(() => {
    publishedKeys().then(setKeys, () => setKeys([]));
  }, []);
  if (keys.length === 0) return null;
  return (
    <div className="border-t border-line bg-well px-[18px] py-3 text-13">
      <p className="mb-1 text-ink-soft">
        Published {keys.length === 1 ? 'key' : 'keys'}: compare with the one you were sent first.
      </p>
      {keys.map((key) => (
        <CopyText key={key} text={key} what="key" className="block" />
      ))}
    </div>
  );
}

function CheckLine({ check, held }: { check: Check; held: boolean }) {
  const { mark, word, tone } = MARKS[check.state];
  const title = check.id === 'consistency' && held ? 'The head follows the one you hold' : TITLES[check.id];
  return (
    <li className="grid grid-cols-[22px_minmax(0,1fr)_auto] gap-x-2 border-b border-line py-2 last:border-0">
      <span className={`font-bold ${tone}`}>
        <span aria-hidden="true">{mark}</span>
        <span className="sr-only">{word}:</span>
      </span>
      <span>{title}</span>
      <span className="max-w-[22ch] break-words text-right font-mono text-13 text-ink-soft">
        {check.value}
      </span>
      {check.detail ? (
        <span
          className={`col-start-2 col-end-4 [overflow-wrap:anywhere] text-13 ${check.state === 'wrong' ? 'text-rust' : 'text-ink-soft'}`}
        >
          {check.detail}
        </span>
      ) : null}
    </li>
  );
}
