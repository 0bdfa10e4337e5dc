'use client';

import { useRouter } from 'next/navigation';
import { type FormEvent, useState } from 'react';
import { fieldErrors, useAct } from '@/components/identity/useAct';
import { Button } from '@/components/ui/Button';
import { Checkbox } from '@/components/ui/Checkbox';
import { ErrorSummary } from '@/components/ui/ErrorSummary';
import { Field, Textarea, TextInput } from '@/components/ui/Field';
import { Notice } from '@/components/ui/Notice';
import { tell } from '@/components/ui/Toast';
import { settingWords } from './settingWords';

type Settings = Record<string, number | boolean>;
export interface PolicyFormField {
  name: string;
  type: 'number' | 'switch';
  label: string;
  help: string;
  unit?: string;
  least?: number;
  most?: number;
}

interface PolicyFormProps {
  kind: string;
  title: string;
  version: number;
  fields: readonly PolicyFormField[];
  settings: Settings;
}

function readForm(form: HTMLFormElement, fields: readonly PolicyFormField[]): Settings {
  const data = new FormData(form);
  return Object.fromEntries(
    fields.map(({ name, type }) => [name, type === 'switch' ? data.has(name) : Number(data.get(name))]),
  );
}

/** Decide on one policy: first what the change would do, then the reason. */
export function PolicyForm({ kind, title, version, fields, settings }: PolicyFormProps) {
  const router = useRouter();
  const preview = useAct<{ effects: { text: string; count: number }[] }>(`/api/policies/${kind}/preview`);
  const change = useAct<{ version: number }>(`/api/policies/${kind}`);
  const [planned, setPlanned] = useState<{ settings: Settings; effects: string[] } | null>(null);
  const failure = change.failure ?? preview.failure;
  const errors = fieldErrors(failure);
  const stale = failure?.code === 'stale';

  async function show(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    const wanted = readForm(event.currentTarget, fields);
    const answer = await preview.act({ settings: wanted });
    if (answer) setPlanned({ settings: wanted, effects: answer.effects.map(({ text }) => text) });
  }
  async function decide(event: FormEvent<HTMLFormElement>) {
    event.preventDefault();
    if (!planned) return;
    const reason = String(new FormData(event.currentTarget).get('reason') ?? '').trim();
    const answer = await change.act({ settings: planned.settings, version, reason });
    if (!answer) return;
    tell(`${title}: version ${answer.version} is in force`);
    setPlanned(null);
    router.refresh();
  }

  return (
    <div className="grid max-w-[640px] gap-6">
      {stale ? (
        <Notice
          tone="alarm"
          title="Somebody changed this in the meantime"
          action={<Button onClick={() => window.location.reload()}>Show what is in force</Button>}
        >
          {failure.message}
        </Notice>
      ) : failure && Object.keys(errors).length === 0 ? (
        <Notice tone="alarm" title={failure.title}>
          {failure.message}
        </Notice>
      ) : null}
      <form onSubmit={show} onChange={() => setPlanned(null)} className="grid gap-4">
        <ErrorSummary
          errors={Object.entries(errors).map(([path, message]) => ({
            id: path === 'reason' ? 'policy-reason' : `policy-${path.replace('settings.', '')}`,
            message,
          }))}
        />
        <PolicyFields fields={fields} settings={settings} errors={errors} />
        <div>
          <Button type="submit" variant={planned ? 'plain' : 'primary'} busy={preview.busy}>
            Show what it would change
          </Button>
        </div>
      </form>
      {planned ? (
        <form onSubmit={decide} className="grid gap-4 border-t border-line pt-5">
          <Notice tone="info" title="This would happen" live>
            <ul className="grid gap-1">
              {planned.effects.map((text) => (
                <li key={text}>{text}</li>
              ))}
            </ul>
          </Notice>
          <Field
            id="policy-reason"
            label="Reason"
            help="It is kept with this change and shown to the auditor."
            required
            error={errors.reason}
          >
            <Textarea name="reason" minLength={5} maxLength={500} />
          </Field>
          <div>
            <Button type="submit" variant="primary" busy={change.busy} busyLabel="Changing">
              Put version {version + 1} in force
            </Button>
          </div>
        </form>
      ) : null}
    </div>
  );
}

function PolicyFields({
  fields,
  settings,
  errors,
}: Pick<PolicyFormProps, 'fields' | 'settings'> & { errors: Record<string, string> }) {
  return fields.map((field) => {
    const id = `policy-${field.name}`;
    const value = settings[field.name];
    if (field.type === 'switch')
      return (
        <Checkbox
          key={field.name}
          id={id}
          name={field.name}
          label={field.label}
          help={field.help}
          defaultChecked={value === true}
        />
      );
    return (
      <Field
        key={field.name}
        id={id}
        label={`${field.label}, ${field.unit}`}
        help={`${field.help} ${field.least} to ${field.most}; now ${settingWords(value, field.unit)}.`}
        required
        error={errors[`settings.${field.name}`]}
      >
        <TextInput
          name={field.name}
          type="number"
          min={field.least}
          max={field.most}
          step={1}
          defaultValue={String(value)}
          mono
        />
      </Field>
    );
  });
}
