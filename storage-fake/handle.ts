import type { IncomingMessage, ServerResponse } from 'node:http';
import { setTimeout as sleep } from 'node:timers/promises';
import { commonHeaders, errorDocument, newRequestId } from './answer';
import { authenticate } from './authenticate';
import { allowOrigin, answerPreflight } from './cors';
import { S3Error } from './errors';
import type { Behaviour } from './exchange';
import { answerFaultAdmin, FAULT_PATH } from './faultAdmin';
import type { Faults } from './faults';
import type { ObjectStore } from './objects';
import { S3Request } from './request';
import { dispatch } from './routes/dispatch';
import type { Credentials } from './sigv4';

export interface Handling {
  store: ObjectStore;
  credentials: Credentials;
  behaviour: Behaviour;
  faults: Faults;
  faultsOverHttp: boolean;
  domains: readonly string[];
  nowMs: () => number;
}

/**
 * Answer one request, whatever it is.
 *
 * @param waits the client sends its body only after 100 Continue
 */
export async function handle(
  handling: Handling,
  message: IncomingMessage,
  response: ServerResponse,
  waits: boolean,
): Promise<void> {
  const requestId = newRequestId();
  commonHeaders(response, requestId);
  const allowed = allowOrigin(message, response, handling.behaviour.allowedOrigins);
  if (message.method === 'OPTIONS') return answerPreflight(message, response, allowed);
  let continued = !waits;
  const sendContinue = (): void => {
    if (!continued) response.writeContinue();
    continued = true;
  };
  try {
    if (handling.faultsOverHttp && message.url === FAULT_PATH) {
      sendContinue();
      return await answerFaultAdmin(handling.faults, message, response);
    }
    const request = new S3Request(message, handling.domains);
    const faults = handling.faults.meet({
      method: request.method,
      key: request.key,
      parameters: new Set(request.query.keys()),
    });
    const delay = faults.get('delay');
    if (delay !== undefined) await sleepWhileAsked(response, delay.milliseconds ?? 1000);
    if (faults.get('slow-down')) throw new S3Error('SlowDown', 'Please reduce your request rate.');
    if (faults.get('internal-error')) throw internal();
    const binding = authenticate(request, handling.credentials, handling.nowMs());
    const { store, behaviour, nowMs } = handling;
    await dispatch({
      message,
      response,
      request,
      requestId,
      binding,
      store,
      behaviour,
      faults,
      nowMs,
      sendContinue,
    });
  } catch (error) {
    await refuse(error, message, response, requestId, continued);
  }
}

/** Wait, but no longer than somebody waits for the answer. */
async function sleepWhileAsked(response: ServerResponse, milliseconds: number): Promise<void> {
  const gone = new AbortController();
  const leave = (): void => gone.abort();
  response.once('close', leave);
  await sleep(milliseconds, undefined, { signal: gone.signal }).catch(() => undefined);
  response.off('close', leave);
}

const internal = () => new S3Error('InternalError', 'We encountered an internal error. Please try again.');

async function refuse(
  error: unknown,
  message: IncomingMessage,
  response: ServerResponse,
  requestId: string,
  continued: boolean,
): Promise<void> {
  // A body that was cut has nobody left to be answered; an answer that was begun cannot become another.
  if (response.headersSent || response.destroyed || (message.destroyed && !message.complete))
    return void response.destroy();
  const refusal = error instanceof S3Error ? error : internal();
  if (refusal !== error) console.error(error);
  const resource = (message.url ?? '/').split('?')[0] as string;
  const body = errorDocument(refusal.code, refusal.message, resource, requestId, refusal.extra);
  for (const name of response.getHeaderNames()) {
    if (/^(content-|etag|last-modified|accept-ranges)/.test(name)) response.removeHeader(name);
  }
  // Most clients read the answer only after the last byte of their body is gone.
  if (continued) await drain(message);
  else response.setHeader('connection', 'close');
  const region = refusal.extra.Region;
  if (region !== undefined) response.setHeader('x-amz-bucket-region', region);
  response.setHeader('content-type', 'application/xml');
  const head = message.method === 'HEAD';
  if (!head) response.setHeader('content-length', body.length);
  response.writeHead(refusal.status).end(head ? undefined : body);
}

function drain(message: IncomingMessage): Promise<void> {
  if (message.complete || message.destroyed) return Promise.resolve();
  return new Promise((resolve) => {
    message
      .once('end', resolve)
      .once('close', resolve)
      .once('error', () => resolve())
      .resume();
  });
}
