import { useClock } from '@/components/ui/Clock';
import { cx } from '@/components/ui/cx';
import { Time } from '@/components/ui/Time';
import type { Session } from './session';

const ENDED: Record<string, string> = {
  'device-moved': ', then it went to another patient',
  timeout: ', then the session was ended because nothing was recorded',
  'device-lost': ', then the device was reported lost',
};

/** Which stethoscope is with the patient, since when, and whether it is in order. */
export function SessionDevice({ session }: { session: Session }) {
  return (
    <p className="flex flex-wrap justify-between gap-x-4 gap-y-1">
      <span>
        <b>{session.model}</b> <span className="mono text-13 text-ink-soft">{session.assetTag}</span>{' '}
        {session.closedAt === null ? (
          <>
            is with this patient since <Time at={session.openedAt} mode="clock" />
          </>
        ) : (
          <>
            was with this patient from <Time at={session.openedAt} mode="minute" /> to{' '}
            <Time at={session.closedAt} mode="clock" />
            {ENDED[session.closedWhy ?? ''] ?? ''}
          </>
        )}
      </span>
      <Check session={session} />
    </p>
  );
}

function Check({ session }: { session: Session }) {
  const { now } = useClock();
  const { lastCheckAt, checkDueAt } = session;
  if (session.deviceState !== 'in-service')
    return (
      <span className="font-semibold text-rust">
        ▲ not in service: {session.deviceState.replace('-', ' ')}
      </span>
    );
  if (lastCheckAt === null) return <span className="text-ink-soft">No acoustic check yet</span>;
  const late = checkDueAt !== null && now !== undefined && checkDueAt < now;
  return (
    <span className={cx(late ? 'font-semibold text-brass' : 'text-ink-soft')}>
      Checked <Time at={lastCheckAt} mode="date" className="" />
      {checkDueAt === null ? null : (
        <>
          {late ? ', check overdue since ' : ', good until '}
          <Time at={checkDueAt} mode="date" className="" />
        </>
      )}
    </span>
  );
}
