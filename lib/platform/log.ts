import pino from 'pino';

export type Log = pino.Logger;

/** Fields that hold a secret or a patient, wherever they stand in a logged object. */
const SECRET_FIELDS = [
  'token',
  'accessToken',
  'credential',
  'authorization',
  'dpop',
  'cookie',
  'password',
  'secret',
  'code',
  'url',
  'privateKey',
  'privateJwk',
  'name',
  'familyName',
  'givenName',
  'birthDate',
  'patientName',
  'recordNumber',
  'email',
  'totp',
  'wristband',
  'encounterNumber',
];

const SHAPES: [RegExp, string][] = [
  // A JWT or JWS in compact form.
  [/eyJ[\w-]{8,}\.[\w-]+\.[\w-]*/g, '[token]'],
  // What makes a presigned address a secret.
  [/(X-Amz-(?:Signature|Credential|Security-Token))=[^&\s"']+/gi, '$1=[redacted]'],
  [/\b(Bearer|DPoP|Basic)\s+[\w.~+/=-]{8,}/g, '$1 [redacted]'],
];

/** Take secrets out of a sentence by their shape. */
export function redactText(text: string): string {
  return SHAPES.reduce((result, [shape, instead]) => result.replace(shape, instead), text);
}

const redactError = (error: unknown): unknown => {
  if (!(error instanceof Error)) return error;
  const { type, message, stack } = pino.stdSerializers.err(error);
  const code = (error as { code?: unknown }).code;
  return { type, message: redactText(message), stack: redactText(stack), ...(code ? { code } : {}) };
};

/**
 * The log: one JSON object a line. Nobody's token, presigned address or patient's name gets into it: fields are
 * redacted by name, texts by shape.
 */
export function createLog(level: string, destination?: pino.DestinationStream): Log {
  const paths = SECRET_FIELDS.flatMap((field) => [field, `*.${field}`, `*.*.${field}`]);
  return pino(
    {
      level,
      base: undefined,
      redact: { paths, censor: '[redacted]' },
      serializers: { err: redactError, error: redactError },
      hooks: {
        logMethod(args, method) {
          method.apply(
            this,
            args.map((arg) => (typeof arg === 'string' ? redactText(arg) : arg)) as typeof args,
          );
        },
      },
    },
    destination ?? pino.destination({ fd: 1, sync: false }),
  );
}
