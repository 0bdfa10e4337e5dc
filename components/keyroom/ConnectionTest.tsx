'use client';

import { useRouter } from 'next/navigation';
import { useAct } from '@/components/identity/useAct';
import { Button } from '@/components/ui/Button';
import { Notice } from '@/components/ui/Notice';
import { Time } from '@/components/ui/Time';

interface Step {
  name: string;
  ok: boolean;
  detail: string;
}
export interface LastCheck {
  ok: boolean;
  steps: readonly Step[];
  at: number;
  by: string;
}

/** The button that does the real thing, and what the last press of it found. */
export function ConnectionTest({
  kind,
  label,
  check,
}: {
  kind: string;
  label: string;
  check: LastCheck | null;
}) {
  const router = useRouter();
  const { act, busy, failure } = useAct(`/api/connections/${kind}/test`);
  return (
    <div className="grid gap-3">
      {failure ? (
        <Notice tone="alarm" title="Not tested">
          {failure.message}
        </Notice>
      ) : null}
      {check ? (
        <div>
          <p className={check.ok ? 'font-semibold text-spruce' : 'font-semibold text-rust'}>
            {check.ok ? '● It works' : '▲ It does not work'}
            <span className="font-normal text-ink-soft">
              , tested <Time at={check.at} ago /> by {check.by}
            </span>
          </p>
          <ul className="mt-1 grid gap-0.5">
            {check.steps.map(({ name, ok, detail }) => (
              <li key={name} className="grid grid-cols-[1.4em_minmax(0,1fr)]">
                <span aria-hidden="true" className={ok ? 'text-spruce' : 'text-rust'}>
                  {ok ? '●' : '▲'}
                </span>
                <span>
                  <span className="sr-only">{ok ? 'passed: ' : 'failed: '}</span>
                  <b>{name}</b> <span className="break-words text-ink-soft">{detail}</span>
                </span>
              </li>
            ))}
          </ul>
        </div>
      ) : (
        <p className="text-ink-soft">Not tested yet.</p>
      )}
      <div>
        <Button
          busy={busy}
          busyLabel="Testing"
          onClick={async () => {
            if (await act({})) router.refresh();
          }}
        >
          {label}
        </Button>
      </div>
    </div>
  );
}
