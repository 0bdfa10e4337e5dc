import { describeModel, ModelDescription } from '@/lib/fleet/describeModel';
import { personRoute } from '@/lib/http/person';
import { personActor } from '@/lib/platform/authority';

/** Describe a device model. */
export const POST = personRoute(
  'POST /api/models',
  { body: ModelDescription },
  async ({ person, body, services }) =>
    Response.json(
      { id: await describeModel(services, personActor(person, 'model.write'), body) },
      { status: 201 },
    ),
);
