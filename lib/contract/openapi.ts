import { z } from 'zod';
import {
  createDocument,
  type ZodOpenApiObject,
  type ZodOpenApiPathItemObject,
  type ZodOpenApiResponsesObject,
} from 'zod-openapi';
import { DEVICE_OPERATIONS, type Operation } from './operations';
import { PROBLEMS, type ProblemCode } from './problems';

export type ApiDocument = ReturnType<typeof createDocument>;

const Problem = z
  .looseObject({
    type: z
      .string()
      .meta({ description: 'Address of the problem’s page; its last part is the stable code.' }),
    title: z.string(),
    status: z.number().int(),
    detail: z.string().meta({ description: 'What happened, what was kept, what to do next.' }),
    keeps: z.string().meta({ description: 'What became of what was sent.' }),
    next: z.string().meta({ description: 'The next step.' }),
    requestId: z.string().meta({ description: 'To give to IT; also in X-Request-Id.' }),
    errors: z
      .array(z.object({ path: z.string(), message: z.string() }))
      .optional()
      .meta({ description: 'Members of the body that are not right.' }),
  })
  .meta({ id: 'Problem', description: 'Problem details (RFC 9457).' });

const ANSWER_HEADERS = z.object({
  'X-Request-Id': z.string().meta({ description: 'Names this call in our log.' }),
  'DPoP-Nonce': z.string().meta({ description: 'For the next proof (RFC 9449, 8.2).' }),
});
const WAITING = z.object({
  'Retry-After': z
    .string()
    .optional()
    .meta({ description: 'Seconds to wait before the same call is repeated.' }),
});
const CHALLENGED = z.object({
  'WWW-Authenticate': z
    .string()
    .optional()
    .meta({ description: 'DPoP with the algorithms that are taken, or use_dpop_nonce.' }),
});

const headersFor = (status: number) => {
  if (status === 401) return ANSWER_HEADERS.extend(CHALLENGED.shape);
  if (status === 429 || status === 503) return ANSWER_HEADERS.extend(WAITING.shape);
  return ANSWER_HEADERS;
};

function problemResponses(codes: readonly ProblemCode[], origin: string): ZodOpenApiResponsesObject {
  const byStatus = new Map<number, ProblemCode[]>();
  for (const code of codes) {
    const { status } = PROBLEMS[code];
    byStatus.set(status, [...(byStatus.get(status) ?? []), code]);
  }
  return Object.fromEntries(
    [...byStatus].map(([status, same]) => [
      String(status),
      {
        description: same.map((code) => `\`${code}\`: ${PROBLEMS[code].title}.`).join(' '),
        headers: headersFor(status),
        content: {
          'application/problem+json': {
            schema: Problem,
            examples: Object.fromEntries(same.map((code) => [code, { value: exampleOf(code, origin) }])),
          },
        },
      },
    ]),
  );
}

const exampleOf = (code: ProblemCode, origin: string) => {
  const { status, title, keeps, next } = PROBLEMS[code];
  return {
    type: `${origin}/problems/${code}`,
    title,
    status,
    detail: `${keeps} ${next}`,
    keeps,
    next,
    requestId: '5e0b2c9e-5a35-4f0c-9d6b-0d1c6b0a7d11',
  };
};

const DPOP_FIELD = z.string().optional().meta({
  description:
    'A fresh proof for this call (RFC 9449, 4.2): JWS with typ dpop+jwt and the public key as jwk; htm, htu, ath, jti, iat and nonce. Left out for Bearer credentials only.',
});

const CREDENTIALS: Record<string, string[]>[] = [{ dpop: [] }, { bearer: [] }];

function pathOf(operation: Operation, origin: string): ZodOpenApiPathItemObject {
  const path = operation.path.includes('{recording}')
    ? { path: z.object({ recording: z.string().meta({ description: 'Our number from the slot.' }) }) }
    : {};
  const header = operation.authenticated ? { header: z.object({ DPoP: DPOP_FIELD }) } : {};
  return {
    post: {
      operationId: operation.id,
      summary: operation.summary,
      description: operation.description,
      tags: ['device'],
      security: operation.authenticated ? CREDENTIALS : [],
      requestParams: { ...path, ...header },
      requestBody: {
        required: true,
        content: { 'application/json': { schema: operation.body } },
      },
      responses: {
        ...Object.fromEntries(
          operation.answers.map(({ status, when, schema }) => [
            String(status),
            { description: when, headers: ANSWER_HEADERS, content: { 'application/json': { schema } } },
          ]),
        ),
        ...problemResponses(operation.problems, origin),
      },
    },
  };
}

/**
 * The device API as an OpenAPI 3.1 document, made of the schemas that the routes themselves parse with.
 *
 * @param origin address of this service, without a trailing slash
 */
export function deviceApiDocument(origin: string): ApiDocument {
  const document: ZodOpenApiObject = {
    openapi: '3.1.0',
    info: {
      title: 'Bellkeep device API',
      version: '1',
      description:
        'What an electronic stethoscope does to hand over recordings. Times are UTC milliseconds. Every refusal is a problem of the catalogue (RFC 9457), and every call may be repeated.',
      license: { name: 'All rights reserved', url: `${origin}/device-api` },
    },
    servers: [{ url: origin }],
    tags: [{ name: 'device', description: 'Calls of a device.' }],
    externalDocs: { url: `${origin}/device-api`, description: 'Step by step, with a walk-through' },
    components: {
      securitySchemes: {
        dpop: {
          type: 'http',
          scheme: 'DPoP',
          description: 'Authorization: DPoP TOKEN, with a proof in the field DPoP (RFC 9449, 7.1).',
        },
        bearer: {
          type: 'http',
          scheme: 'bearer',
          bearerFormat: 'JWT',
          description: 'For models that cannot sign. Shorter lived, and shown as weaker.',
        },
      },
    },
    paths: Object.fromEntries(
      DEVICE_OPERATIONS.map((operation) => [operation.path, pathOf(operation, origin)]),
    ),
  };
  return createDocument(document);
}
