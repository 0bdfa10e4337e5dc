'use client';

import { useRouter } from 'next/navigation';
import { useState } from 'react';
import { sendJson } from '@/components/shell/useData';
import { Button } from '@/components/ui/Button';
import { ConfirmDialog } from '@/components/ui/ConfirmDialog';
import { Time } from '@/components/ui/Time';
import { tell } from '@/components/ui/Toast';
import { ROLE_NAMES, ROLES, type Role } from '@/lib/identity/permissions';
import { ROLE_HELP } from './roleWords';

export interface HeldRole {
  role: Role;
  givenBy: string | null;
  givenAt: number;
}

/** Which roles a person holds; giving or taking one ends their sessions. */
export function PersonRoles({ id, name, held }: { id: string; name: string; held: readonly HeldRole[] }) {
  const router = useRouter();
  const [change, setChange] = useState<{ role: Role; held: boolean } | null>(null);
  return (
    <>
      <ul className="grid divide-y divide-line">
        {ROLES.map((role) => (
          <RoleLine
            key={role}
            role={role}
            found={held.find((one) => one.role === role)}
            onChange={(wanted) => setChange({ role, held: wanted })}
          />
        ))}
      </ul>
      <ConfirmDialog
        open={change !== null}
        onOpenChange={(open) => (open ? undefined : setChange(null))}
        title={change ? titleOf(change, name) : ''}
        confirmLabel={change?.held ? 'Give the role' : 'Take the role away'}
        danger={!change?.held}
        onConfirm={async () => {
          if (!change) return;
          await sendJson(`/api/people/${id}/roles`, change, crypto.randomUUID());
          tell(
            change.held ? 'The role is given' : 'The role is taken away',
            `Sessions of ${name} were ended.`,
          );
          router.refresh();
        }}
      >
        <p>{change ? ROLE_HELP[change.role] : ''}</p>
        <p>Their sessions end at once, and they sign in again with what they may do then.</p>
      </ConfirmDialog>
    </>
  );
}

const titleOf = (change: { role: Role; held: boolean }, name: string): string =>
  change.held
    ? `Give ${name} the role “${ROLE_NAMES[change.role]}”`
    : `Take the role “${ROLE_NAMES[change.role]}” from ${name}`;

interface RoleLineProps {
  role: Role;
  found: HeldRole | undefined;
  onChange: (held: boolean) => void;
}

function RoleLine({ role, found, onChange }: RoleLineProps) {
  return (
    <li className="flex flex-wrap items-center justify-between gap-x-4 gap-y-2 py-3">
      <div className="min-w-0">
        <p className={found ? 'font-semibold' : undefined}>{ROLE_NAMES[role]}</p>
        <p className="max-w-line text-13 text-ink-soft">
          {found ? (
            <>
              Held since <Time at={found.givenAt} mode="date" />
              {found.givenBy ? `, given by ${found.givenBy}` : ''}
            </>
          ) : (
            ROLE_HELP[role]
          )}
        </p>
      </div>
      <Button
        size="small"
        variant={found ? 'danger' : 'plain'}
        aria-label={`${found ? 'Take away' : 'Give'}: ${ROLE_NAMES[role]}`}
        onClick={() => onChange(!found)}
      >
        {found ? 'Take away' : 'Give'}
      </Button>
    </li>
  );
}
