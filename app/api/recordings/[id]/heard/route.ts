import { z } from 'zod';
import { personRoute } from '@/lib/http/person';
import { openRecording } from '@/lib/http/reach';

const seconds = z.number().min(0).max(86_400);
const Body = z
  .strictObject({
    /** Through which band, in Hz; null as recorded. */
    band: z
      .strictObject({ lowHz: z.number().min(0).max(96_000), highHz: z.number().min(1).max(96_000) })
      .nullable(),
    fromSeconds: seconds,
    toSeconds: seconds,
    /** How long it was listened to, with repeats. */
    seconds,
  })
  .refine((heard) => heard.toSeconds >= heard.fromSeconds, {
    path: ['toSeconds'],
    message: 'ends before it begins',
  });

const rounded = (value: number): number => Math.round(value * 10) / 10;

/**
 * How a recording was listened to, told by the player after each act. That it was heard is written when its bytes are
 * handed out, whatever the player tells.
 */
export const POST = personRoute(
  'POST /api/recordings/[id]/heard',
  { body: Body },
  async ({ person, body, params, services }) => {
    await openRecording(services, person, params.id ?? '', 'heard', {
      detail: {
        band: body.band
          ? `${Math.round(body.band.lowHz)} to ${Math.round(body.band.highHz)} Hz`
          : 'as recorded',
        from: rounded(body.fromSeconds),
        to: rounded(body.toSeconds),
      },
      facts: { seconds: rounded(body.seconds) },
    });
    return new Response(null, { status: 204 });
  },
);
