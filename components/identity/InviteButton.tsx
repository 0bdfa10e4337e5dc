'use client';

import { useRouter } from 'next/navigation';
import { type FormEvent, useId, useState } from 'react';
import { Button } from '@/components/ui/Button';
import { Checkbox, FieldSet } from '@/components/ui/Checkbox';
import { Dialog } from '@/components/ui/Dialog';
import { ErrorSummary } from '@/components/ui/ErrorSummary';
import { Field, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { tell } from '@/components/ui/Toast';
import { ROLE_NAMES, ROLES, type Role } from '@/lib/identity/permissions';
import { ROLE_HELP } from './roleWords';
import { fieldErrors, useAct } from './useAct';

export interface WardChoice {
  id: string;
  name: string;
}

/** Invite somebody: the primary action of the people pages. */
export function InviteButton({ wards }: { wards: readonly WardChoice[] }) {
  const [open, setOpen] = useState(false);
  const formId = useId();
  const { act, busy, failure } = useAct<{ id: string }>('/api/invitations');
  const router = useRouter();
  async function invite(body: Record<string, unknown>) {
    if (!(await act(body))) return;
    setOpen(false);
    tell(`Invitation sent to ${String(body.email)}`, 'It works once, within seven days.');
    router.refresh();
  }
  return (
    <>
      <Button variant="primary" onClick={() => setOpen(true)}>
        Invite somebody
      </Button>
      <Dialog
        open={open}
        onOpenChange={busy ? () => undefined : setOpen}
        title="Invite somebody"
        description="They get a mail with an address that works once, and choose a password of their own."
        footer={
          <>
            <Button onClick={() => setOpen(false)} disabled={busy}>
              Leave it
            </Button>
            <Button type="submit" form={formId} variant="primary" busy={busy} busyLabel="Sending">
              Send the invitation
            </Button>
          </>
        }
      >
        <InviteForm id={formId} wards={wards} failure={failure} onInvite={invite} />
      </Dialog>
    </>
  );
}

interface InviteFormProps {
  id: string;
  wards: readonly WardChoice[];
  failure: ReturnType<typeof useAct>['failure'];
  onInvite: (body: Record<string, unknown>) => Promise<void>;
}

function InviteForm({ id, wards, failure, onInvite }: InviteFormProps) {
  const [roles, setRoles] = useState<readonly Role[]>([]);
  const errors = fieldErrors(failure);
  const submit = (event: FormEvent<HTMLFormElement>) => {
    event.preventDefault();
    const form = new FormData(event.currentTarget);
    const text = (name: string) => String(form.get(name) ?? '').trim();
    void onInvite({
      name: text('name'),
      email: text('email'),
      jobTitle: text('jobTitle') || null,
      roles,
      wardIds: roles.includes('clinician') ? form.getAll('ward').map(String) : [],
    });
  };
  const summary = Object.entries(errors).map(([path, message]) => ({ id: `invite-${path}`, message }));
  return (
    <form id={id} onSubmit={submit} className="grid gap-4">
      {summary.length > 0 ? (
        <ErrorSummary errors={summary} />
      ) : failure ? (
        <Notice tone="alarm" title="Not invited">
          {failure.message}
        </Notice>
      ) : null}
      <Field id="invite-name" label="Name" help="As it stands on their badge." required error={errors.name}>
        <TextInput name="name" autoComplete="off" maxLength={120} />
      </Field>
      <Field id="invite-email" label="E-mail" required error={errors.email}>
        <TextInput name="email" type="email" autoComplete="off" maxLength={254} />
      </Field>
      <Field id="invite-jobTitle" label="What they do" optional error={errors.jobTitle}>
        <TextInput name="jobTitle" autoComplete="off" maxLength={120} placeholder="Respiratory medicine" />
      </Field>
      <RoleFields roles={roles} onRoles={setRoles} error={errors.roles} />
      {roles.includes('clinician') && wards.length > 0 ? (
        <WardFields wards={wards} error={errors.wardIds} />
      ) : null}
    </form>
  );
}

function RoleFields({
  roles,
  onRoles,
  error,
}: {
  roles: readonly Role[];
  onRoles: (roles: readonly Role[]) => void;
  error?: string | undefined;
}) {
  return (
    <FieldSet legend="Roles" error={error}>
      {ROLES.map((role, index) => (
        <Checkbox
          key={role}
          {...(index === 0 ? { id: 'invite-roles' } : {})}
          label={ROLE_NAMES[role]}
          help={ROLE_HELP[role]}
          checked={roles.includes(role)}
          onChange={(event) =>
            onRoles(event.target.checked ? [...roles, role] : roles.filter((held) => held !== role))
          }
        />
      ))}
    </FieldSet>
  );
}

function WardFields({ wards, error }: { wards: readonly WardChoice[]; error?: string | undefined }) {
  return (
    <FieldSet legend="Wards" help="Looking at patients elsewhere asks for a reason." error={error}>
      <div className="grid grid-cols-2 gap-x-4">
        {wards.map((ward, index) => (
          <Checkbox
            key={ward.id}
            {...(index === 0 ? { id: 'invite-wardIds' } : {})}
            name="ward"
            value={ward.id}
            label={ward.name}
          />
        ))}
      </div>
    </FieldSet>
  );
}
