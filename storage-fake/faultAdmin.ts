import type { IncomingMessage, ServerResponse } from 'node:http';
import { FAULT_KINDS, type FaultRule, type Faults } from './faults';

/** No bucket can have this name: one character is too short. */
export const FAULT_PATH = '/-/faults';

/**
 * Faults over HTTP, for tests in another process: GET lists, POST adds one (JSON of a `FaultRule`, the key as the
 * text of a pattern), DELETE clears.
 */
export async function answerFaultAdmin(
  faults: Faults,
  message: IncomingMessage,
  response: ServerResponse,
): Promise<void> {
  const answer = (status: number, value: unknown): void => {
    const body = Buffer.from(JSON.stringify(value));
    response
      .writeHead(status, { 'content-type': 'application/json', 'content-length': body.length })
      .end(body);
  };
  if (message.method === 'GET')
    return answer(
      200,
      faults.list().map(({ id, rule, met }) => ({ id, met, ...rule, key: textOf(rule.key) })),
    );
  if (message.method === 'DELETE') {
    faults.clear();
    return answer(200, []);
  }
  if (message.method !== 'POST') return answer(405, { error: 'GET, POST or DELETE' });
  const pieces: Buffer[] = [];
  for await (const piece of message) pieces.push(piece as Buffer);
  const rule = parseRule(Buffer.concat(pieces).toString('utf8'));
  if (rule === undefined) return answer(400, { error: `kind must be one of ${FAULT_KINDS.join(', ')}` });
  return answer(201, { id: faults.add(rule) });
}

const textOf = (key: FaultRule['key']): string | undefined => (key instanceof RegExp ? key.source : key);

function parseRule(text: string): FaultRule | undefined {
  let value: unknown;
  try {
    value = JSON.parse(text);
  } catch {
    return undefined;
  }
  if (typeof value !== 'object' || value === null) return undefined;
  const given = value as Record<string, unknown>;
  const kind = FAULT_KINDS.find((one) => one === given.kind);
  if (kind === undefined) return undefined;
  const string = (name: string) => (typeof given[name] === 'string' ? given[name] : undefined);
  const number = (name: string) => (typeof given[name] === 'number' ? given[name] : undefined);
  return {
    kind,
    method: string('method'),
    key: string('key'),
    parameter: string('parameter'),
    count: number('count'),
    milliseconds: number('milliseconds'),
    atByte: number('atByte'),
  };
}
