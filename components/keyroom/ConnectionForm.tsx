'use client';

import { useRouter } from 'next/navigation';
import { type FormEvent, useId, useState } from 'react';
import { fieldErrors, useAct } from '@/components/identity/useAct';
import { Button } from '@/components/ui/Button';
import { Checkbox } from '@/components/ui/Checkbox';
import { Dialog } from '@/components/ui/Dialog';
import { Field, Textarea, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { tell } from '@/components/ui/Toast';

export interface ConnectionField {
  name: string;
  label: string;
  help?: string;
  type: 'text' | 'url' | 'switch';
}
interface ConnectionFormProps {
  kind: string;
  title: string;
  fields: readonly ConnectionField[];
  secretLabel: string;
  settings: Record<string, unknown>;
  hasSecret: boolean;
  version: number;
}

/** Set how another system is reached, or no longer. */
export function ConnectionForm(props: ConnectionFormProps) {
  const { kind, title, fields, settings, version } = props;
  const [open, setOpen] = useState(false);
  const [off, setOff] = useState(false);
  const formId = useId();
  const router = useRouter();
  const { act, busy, failure } = useAct<{ version: number }>(`/api/connections/${kind}`);
  const isSet = Object.keys(settings).length > 0;

  async function submit(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    const form = new FormData(event.currentTarget);
    const value = (name: string) => String(form.get(name) ?? '').trim();
    const secret = value('secret');
    const answer = await act({
      settings: off
        ? {}
        : Object.fromEntries(
            fields.map(({ name, type }) => [name, type === 'switch' ? form.has(name) : value(name)]),
          ),
      ...(secret === '' || off ? {} : { secret }),
      version,
      reason: value('reason'),
    });
    if (!answer) return;
    setOpen(false);
    setOff(false);
    tell(off ? `${title} is no longer reached` : `${title} is set`, off ? undefined : 'Test it now.');
    router.refresh();
  }
  return (
    <>
      <Button onClick={() => setOpen(true)}>{isSet ? 'Change…' : 'Set it up…'}</Button>
      <Dialog
        open={open}
        onOpenChange={busy ? () => undefined : setOpen}
        title={title}
        footer={
          <>
            <Button onClick={() => setOpen(false)} disabled={busy}>
              Leave it as it is
            </Button>
            <Button type="submit" form={formId} variant="primary" busy={busy} busyLabel="Saving">
              {off ? 'Stop reaching it' : 'Save'}
            </Button>
          </>
        }
      >
        <form id={formId} onSubmit={submit} className="grid gap-4">
          {failure ? (
            <Notice tone="alarm" title={failure.title}>
              {failure.message}
            </Notice>
          ) : null}
          {off ? null : <Fields {...props} errors={fieldErrors(failure)} />}
          {isSet ? (
            <Checkbox
              label="Do not reach it any more"
              checked={off}
              onChange={(event) => setOff(event.target.checked)}
            />
          ) : null}
          <Field label="Reason" help="It is kept with this change and shown to the auditor." required>
            <Textarea name="reason" minLength={5} maxLength={500} />
          </Field>
        </form>
      </Dialog>
    </>
  );
}

function Fields({
  fields,
  settings,
  secretLabel,
  hasSecret,
  errors,
}: ConnectionFormProps & { errors: Record<string, string> }) {
  return (
    <>
      {fields.map(({ name, label, help, type }) =>
        type === 'switch' ? (
          <Checkbox
            key={name}
            name={name}
            label={label}
            help={help}
            defaultChecked={settings[name] === true}
          />
        ) : (
          <Field
            key={name}
            label={label}
            required
            {...(help ? { help } : {})}
            error={errors[`settings.${name}`]}
          >
            <TextInput
              name={name}
              type={type}
              defaultValue={String(settings[name] ?? '')}
              mono={type === 'url'}
              autoComplete="off"
              maxLength={500}
            />
          </Field>
        ),
      )}
      <Field
        label={secretLabel}
        optional
        help={hasSecret ? 'One is set. Leave this empty to keep it.' : 'Kept sealed, and never shown again.'}
      >
        <TextInput name="secret" type="password" autoComplete="off" maxLength={4000} />
      </Field>
    </>
  );
}
