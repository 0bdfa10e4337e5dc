import { z } from 'zod';

/** One thing that a policy decides. Its name carries its unit. */
export type PolicyField =
  | {
      type: 'number';
      label: string;
      unit: string;
      help: string;
      least: number;
      most: number;
      initial: number;
    }
  | { type: 'switch'; label: string; help: string; initial: boolean };

interface PolicyKindData {
  title: string;
  /** What it decides, one sentence. */
  about: string;
  fields: Record<string, PolicyField>;
  /** What must hold between fields: [field, smaller than field, in words]. */
  order?: readonly (readonly [string, string, string])[];
}

const number = (
  label: string,
  unit: string,
  help: string,
  [least, most]: readonly [number, number],
  initial: number,
) => ({ type: 'number' as const, label, unit, help, least, most, initial });

/**
 * What a hospital decides, as data: a form, a history and an answer to "what is in force" follow from a line here. A
 * further kind is a further member, with its effects in effects.ts where a change touches what exists. Initial values
 * are common practice, no source; local law and policy come first.
 */
export const POLICY_KINDS = {
  credentials: {
    title: 'Credentials',
    about: 'How long a device’s credential lives, when it is renewed, and how long two work side by side.',
    fields: {
      boundLifetimeDays: number(
        'Bound credentials live',
        'days',
        'Bound to the key of the device.',
        [2, 400],
        90,
      ),
      boundRenewBeforeDays: number(
        'They are renewed before their end',
        'days',
        'From here on the device is told to.',
        [1, 200],
        21,
      ),
      bearerLifetimeDays: number(
        'Bearer credentials live',
        'days',
        'Whoever copies one has all of it.',
        [2, 90],
        14,
      ),
      bearerRenewBeforeDays: number(
        'They are renewed before their end',
        'days',
        'From here on the device is told to.',
        [1, 60],
        5,
      ),
      overlapHours: number(
        'Old and new work side by side',
        'hours',
        'At the longest: the old one ends when the new one is first used.',
        [1, 336],
        24,
      ),
    },
    order: [
      [
        'boundRenewBeforeDays',
        'boundLifetimeDays',
        'Renewal begins before the end: fewer days than the credential lives.',
      ],
      [
        'bearerRenewBeforeDays',
        'bearerLifetimeDays',
        'Renewal begins before the end: fewer days than the credential lives.',
      ],
    ],
  },
  clock: {
    title: 'Clocks',
    about:
      'How far clocks may differ before somebody is told. A device’s clock is never believed either way.',
    fields: {
      deviceNoticeSeconds: number(
        'A device’s clock is named when it is off by',
        'seconds',
        'On the page of health.',
        [1, 86_400],
        300,
      ),
      clientSkewSeconds: number(
        'API clients’ clocks may be off by',
        'seconds',
        'When they sign in with a key of their own.',
        [0, 300],
        30,
      ),
    },
  },
  retention: {
    title: 'Retention',
    about: 'How long what is kept is kept. It rules what is sealed from now on; a lock is never shortened.',
    fields: {
      originalYears: number(
        'Originals are locked for',
        'years',
        'Where the store has object lock.',
        [1, 100],
        8,
      ),
      quarantineDays: number(
        'Quarantined bytes are kept for',
        'days',
        'Bytes that are not the announced ones.',
        [1, 3650],
        365,
      ),
      deliveryDays: number(
        'Deliveries to webhooks are listed for',
        'days',
        'Then the list forgets them; the log does not.',
        [1, 365],
        30,
      ),
    },
  },
  evidence: {
    title: 'Evidence',
    about: 'Who may take a recording’s evidence out of the house.',
    fields: {
      secondPerson: {
        type: 'switch' as const,
        label: 'A second person approves each package',
        help: 'Somebody who is not the one who asks.',
        initial: false,
      },
    },
  },
} as const satisfies Record<string, PolicyKindData>;

export type PolicyKind = keyof typeof POLICY_KINDS;
type FieldsOf<K extends PolicyKind> = (typeof POLICY_KINDS)[K]['fields'];
export type PolicySettings<K extends PolicyKind> = {
  [F in keyof FieldsOf<K>]: FieldsOf<K>[F] extends { type: 'number' } ? number : boolean;
};
export type AnySettings = Record<string, number | boolean>;

export const isPolicyKind = (kind: string): kind is PolicyKind => Object.hasOwn(POLICY_KINDS, kind);

export const policyKind = (kind: PolicyKind): PolicyKindData => POLICY_KINDS[kind];

/** What is in force before anybody decided. */
export const initialSettings = <K extends PolicyKind>(kind: K): PolicySettings<K> =>
  Object.fromEntries(
    Object.entries(policyKind(kind).fields).map(([name, { initial }]) => [name, initial]),
  ) as PolicySettings<K>;

function fieldSchema(field: PolicyField): z.ZodType<number | boolean> {
  if (field.type === 'switch') return z.boolean();
  const range = `${field.least} to ${field.most} ${field.unit}`;
  return z.number(range).int(`whole ${field.unit}`).min(field.least, range).max(field.most, range);
}

/** Settings of a kind: every field, and nothing else. */
export function settingsSchema(kind: PolicyKind): z.ZodType<AnySettings> {
  const { fields, order = [] } = policyKind(kind);
  const shape = Object.fromEntries(Object.entries(fields).map(([name, field]) => [name, fieldSchema(field)]));
  return z.strictObject(shape).check((context) => {
    for (const [smaller, larger, message] of order)
      if (!((context.value[smaller] as number) < (context.value[larger] as number)))
        context.issues.push({ code: 'custom', path: [smaller], message, input: context.value });
  }) as z.ZodType<AnySettings>;
}
