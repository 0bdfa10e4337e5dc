import { z } from 'zod';
import { policyVersion } from '@/db/schema';
import type { Tx } from '@/db/write';
import { appendEntries } from '@/lib/custody/append';
import { type Authorized, personActor } from '@/lib/platform/authority';
import { Refusal } from '@/lib/platform/errors';
import type { Services } from '@/lib/platform/services';
import { currentPolicy } from './currentPolicy';
import { EFFECTS, type Effect } from './effects';
import { type AnySettings, isPolicyKind, type PolicyKind, policyKind, settingsSchema } from './kinds';

const Settings = z.record(z.string(), z.union([z.number(), z.boolean()]));
export const PolicyPreview = z.strictObject({ settings: Settings });
export const PolicyChange = z.strictObject({
  settings: Settings,
  /** The version that whoever decides was looking at. */
  version: z.number().int().min(0),
  reason: z.string().trim().min(5, 'A reason of at least five letters is needed.').max(500),
});
export type PolicyChange = z.infer<typeof PolicyChange>;

interface Changed {
  version: number;
  settings: AnySettings;
}

function kindOf(kind: string): PolicyKind {
  if (!isPolicyKind(kind)) throw new Refusal('not-found');
  return kind;
}

function checkedSettings(kind: PolicyKind, given: AnySettings): AnySettings {
  const parsed = settingsSchema(kind).safeParse(given);
  if (parsed.success) return parsed.data;
  const errors = parsed.error.issues.map((issue) => ({
    path: `settings.${issue.path.join('.')}`,
    message: issue.message,
  }));
  throw new Refusal('body-invalid', 'These settings are not right.', { errors });
}

/**
 * What a change would do, before anybody decides. Nothing is written.
 *
 * @throws Refusal `not-found` for an unknown kind, `body-invalid` for settings that cannot be
 */
export async function previewPolicy(
  services: Pick<Services, 'read' | 'clock' | 'env'>,
  _by: Authorized<'policy.write'>,
  kind: string,
  given: AnySettings,
): Promise<{ effects: Effect[]; version: number }> {
  const known = kindOf(kind);
  const settings = checkedSettings(known, given);
  const { settings: before, version } = await currentPolicy(services.read, known, services.env);
  return {
    version,
    effects: await EFFECTS[known].preview(services.read, settings, before, services.clock.now()),
  };
}

/**
 * Decide: a new version is in force from its commit on, with what it does to what exists, in one transaction. Of two
 * who decide on the same version one is told that it was changed.
 *
 * @throws Refusal `not-found`, `body-invalid`, `stale` with the settings in force, `not-possible` where nothing changes
 */
export async function changePolicy(
  services: Pick<Services, 'write' | 'clock' | 'env'>,
  by: Authorized<'policy.write'>,
  kind: string,
  wanted: PolicyChange,
  remember?: (tx: Tx, answer: Changed) => Promise<void>,
): Promise<Changed> {
  const known = kindOf(kind);
  const settings = checkedSettings(known, wanted.settings);
  const now = services.clock.now();
  return await services.write(async (tx) => {
    const current = await currentPolicy(tx, known, services.env);
    const before: AnySettings = current.settings;
    if (current.version !== wanted.version)
      throw new Refusal(
        'stale',
        `${policyKind(known).title} was changed in the meantime: version ${current.version} is in force.`,
        { version: current.version, settings: before },
      );
    const changed = Object.keys(settings).filter((name) => settings[name] !== before[name]);
    if (changed.length === 0) throw new Refusal('not-possible', 'These are the settings that are in force.');
    const version = current.version + 1;
    await tx
      .insert(policyVersion)
      .values({ kind: known, version, settings, reason: wanted.reason, madeBy: by.id, madeAt: now });
    const effects = await EFFECTS[known].preview(tx, settings, before, now);
    await EFFECTS[known].apply?.(tx, settings, now, by.id);
    const only = (all: AnySettings) => Object.fromEntries(changed.map((name) => [name, all[name]]));
    await appendEntries(tx, now, [
      {
        kind: 'policy-changed',
        actor: personActor(by, 'policy.write'),
        subjects: [{ kind: 'policy', id: known }],
        detail: { policy: known, version, reason: wanted.reason, effects: effects.map(({ text }) => text) },
        before: only(before),
        after: only(settings),
      },
    ]);
    const answer = { version, settings };
    await remember?.(tx, answer);
    return answer;
  });
}
