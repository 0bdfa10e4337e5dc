import { and, asc, eq, inArray, isNotNull, isNull, or, sql } from 'drizzle-orm';
import { z } from 'zod';
import { personRole, personWard, user, ward } from '@/db/schema';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { ROLES, type Role } from './permissions';

export const PeopleFilter = z.strictObject({
  q: z.string().trim().max(100).default(''),
  role: z.enum(ROLES).optional(),
  left: z.enum(['yes']).optional(),
  /** Keyset: the id of the last row of the page before. */
  after: z.string().max(100).optional(),
  limit: z.coerce.number().int().min(1).max(200).default(50),
});
export type PeopleFilter = z.infer<typeof PeopleFilter>;

export interface PersonLine {
  id: string;
  name: string;
  email: string;
  jobTitle: string | null;
  roles: Role[];
  wards: string[];
  secondFactor: boolean;
  lastSignedInAt: number | null;
  leftAt: number | null;
}

type Reads = Pick<Services, 'read'>;

/** In plain SQL: among the selected fields of one table, column names would lose their table's. */
const PASSKEYS = sql<number>`(select count(*) from passkey where passkey.person_id = "user".id)`;

const holds = (role: Role) =>
  sql`exists (select 1 from ${personRole} where ${personRole.personId} = ${user.id} and ${personRole.role} = ${role})`;

/** People by name, a page at a time: those who are here, or those who left. */
export async function listPeople(
  services: Reads,
  _by: Authorized<'people.read'>,
  filter: PeopleFilter,
): Promise<{ rows: PersonLine[]; next: string | null }> {
  const { read } = services;
  const pattern = `%${filter.q.replace(/[\\%_]/g, (c) => `\\${c}`)}%`;
  const rows = await read
    .select({
      id: user.id,
      name: user.name,
      email: user.email,
      jobTitle: user.jobTitle,
      twoFactorEnabled: user.twoFactorEnabled,
      passkeys: PASSKEYS,
      lastSignedInAt: user.lastSignedInAt,
      leftAt: user.leftAt,
    })
    .from(user)
    .where(
      and(
        filter.left ? isNotNull(user.leftAt) : isNull(user.leftAt),
        filter.role ? holds(filter.role) : undefined,
        filter.q === ''
          ? undefined
          : or(
              sql`${user.name} like ${pattern} escape '\\'`,
              sql`${user.email} like ${pattern} escape '\\'`,
              sql`${user.jobTitle} like ${pattern} escape '\\'`,
            ),
        filter.after === undefined
          ? undefined
          : sql`(${user.name}, ${user.id}) > (select ${user.name}, ${user.id} from ${user} where ${user.id} = ${filter.after})`,
      ),
    )
    .orderBy(asc(user.name), asc(user.id))
    .limit(filter.limit + 1);
  const page = rows.slice(0, filter.limit);
  const held = await rolesAndWards(
    services,
    page.map((row) => row.id),
  );
  return {
    rows: page.map(({ twoFactorEnabled, passkeys, ...row }) => ({
      ...row,
      roles: held.roles.get(row.id) ?? [],
      wards: held.wards.get(row.id) ?? [],
      secondFactor: twoFactorEnabled === true || passkeys > 0,
    })),
    next: rows.length > filter.limit ? (page.at(-1)?.id ?? null) : null,
  };
}

async function rolesAndWards(services: Reads, ids: string[]) {
  const roles = new Map<string, Role[]>();
  const wards = new Map<string, string[]>();
  if (ids.length === 0) return { roles, wards };
  const [roleRows, wardRows] = await Promise.all([
    services.read.select().from(personRole).where(inArray(personRole.personId, ids)),
    services.read
      .select({ personId: personWard.personId, name: ward.name })
      .from(personWard)
      .innerJoin(ward, eq(ward.id, personWard.wardId))
      .where(inArray(personWard.personId, ids))
      .orderBy(asc(ward.name)),
  ]);
  for (const role of ROLES)
    for (const row of roleRows)
      if (row.role === role) roles.set(row.personId, [...(roles.get(row.personId) ?? []), role]);
  for (const row of wardRows) wards.set(row.personId, [...(wards.get(row.personId) ?? []), row.name]);
  return { roles, wards };
}

export interface PeopleCounts {
  here: number;
  left: number;
  byRole: Record<Role, number>;
  /** IT administrators who have not set up the second factor that they need. */
  withoutSecondFactor: number;
}

/** How many people there are, for the sentence and the filters. */
export async function countPeople(services: Reads, _by: Authorized<'people.read'>): Promise<PeopleCounts> {
  const [[people], roles, [bare]] = await Promise.all([
    services.read
      .select({
        here: sql<number>`coalesce(sum(${user.leftAt} is null), 0)`,
        left: sql<number>`coalesce(sum(${user.leftAt} is not null), 0)`,
      })
      .from(user),
    services.read
      .select({ role: personRole.role, n: sql<number>`count(*)` })
      .from(personRole)
      .innerJoin(user, eq(user.id, personRole.personId))
      .where(isNull(user.leftAt))
      .groupBy(personRole.role),
    services.read
      .select({ n: sql<number>`count(*)` })
      .from(user)
      .where(
        and(
          isNull(user.leftAt),
          holds('itadmin'),
          sql`${user.twoFactorEnabled} is not 1`,
          sql`${PASSKEYS} = 0`,
        ),
      ),
  ]);
  const byRole = Object.fromEntries(
    ROLES.map((role) => [role, roles.find((row) => row.role === role)?.n ?? 0]),
  ) as Record<Role, number>;
  return {
    here: people?.here ?? 0,
    left: people?.left ?? 0,
    byRole,
    withoutSecondFactor: bare?.n ?? 0,
  };
}
