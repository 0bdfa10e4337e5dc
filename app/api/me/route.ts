import { personRoute } from '@/lib/http/person';

/** Who is signed in, and what they may do. */
export const GET = personRoute('GET /api/me', {}, async ({ person }) =>
  Response.json({
    id: person.id,
    name: person.name,
    email: person.email,
    jobTitle: person.jobTitle,
    roles: person.roles,
    wardIds: person.wardIds,
  }),
);
