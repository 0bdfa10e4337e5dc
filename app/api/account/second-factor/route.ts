import { toString as drawQr } from 'qrcode';
import { personRoute } from '@/lib/http/person';
import { beginSecondFactor, WithPassword } from '@/lib/identity/secondFactor';

/** Begin to set up an authenticator. The secret is drawn as a QR code here and is never shown again. */
export const POST = personRoute(
  'POST /api/account/second-factor',
  { body: WithPassword },
  async ({ person, body, peer, services }) => {
    const { uri, recoveryCodes } = await beginSecondFactor(services, person, peer, body.password);
    return Response.json({
      qrSvg: await drawQr(uri, { type: 'svg', errorCorrectionLevel: 'M', margin: 4 }),
      secret: new URL(uri).searchParams.get('secret'),
      recoveryCodes,
    });
  },
);
