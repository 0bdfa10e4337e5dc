import { z } from 'zod';
import { testConnection } from '@/lib/connections/testConnection';
import { personRoute } from '@/lib/http/person';

/** Test a connection by doing the real thing. */
export const POST = personRoute(
  'POST /api/connections/[kind]/test',
  { body: z.strictObject({}) },
  async ({ person, params, services }) =>
    Response.json(await testConnection(services, person, params.kind ?? '')),
);
