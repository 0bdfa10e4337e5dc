import { request as plainRequest } from 'node:http';
import { request as secureRequest } from 'node:https';

/** How often what goes wrong on a ward's wireless network, as shares of all calls; each is drawn from the seed. */
export interface NetworkFaults {
  /** The call never leaves the device. */
  lostRequest: number;
  /** The service does what was asked and the answer is lost. */
  lostAnswer: number;
  /** The call takes up to this long before it goes out. */
  slow: { share: number; longestMs: number };
  /** An upload breaks off somewhere in its body. */
  cutUpload: number;
}

export const CALM: NetworkFaults = {
  lostRequest: 0,
  lostAnswer: 0,
  slow: { share: 0, longestMs: 0 },
  cutUpload: 0,
};

const lost = (why: string) => new TypeError('fetch failed', { cause: new Error(why) });

/**
 * A fetch that fails as networks do. Four numbers are drawn a call whatever happens, so that one fault more or less
 * leaves the faults of later calls where they were.
 */
export function faultyFetch(
  send: typeof fetch,
  faults: NetworkFaults,
  random: () => number,
  sleep: (milliseconds: number) => Promise<void>,
): typeof fetch {
  return async (input, init) => {
    const [what, slow, long, where] = [random(), random(), random(), random()];
    if (slow < faults.slow.share) await sleep(long * faults.slow.longestMs);
    if (what < faults.lostRequest) throw lost('the request was lost');
    const body = init?.body;
    if (body instanceof Uint8Array && body.length > 0 && what < faults.lostRequest + faults.cutUpload) {
      await sendPart(String(input), init, body.subarray(0, Math.floor(where * body.length)), body.length);
      throw lost('the upload broke off');
    }
    const response = await send(input, init);
    if (what > 1 - faults.lostAnswer) {
      // The service has finished; what it says goes nowhere.
      await response.arrayBuffer().catch(() => undefined);
      throw lost('the answer was lost');
    }
    return response;
  };
}

/** Headers that promise the whole body, a part of it, and then the line is dead. */
function sendPart(
  url: string,
  init: RequestInit | undefined,
  part: Uint8Array,
  wholeLength: number,
): Promise<void> {
  const request = url.startsWith('https:') ? secureRequest : plainRequest;
  const headers = Object.fromEntries(new Headers(init?.headers).entries());
  return new Promise((resolve) => {
    const call = request(url, {
      method: init?.method ?? 'PUT',
      headers: { ...headers, 'content-length': wholeLength },
      agent: false,
    });
    const end = () => {
      call.destroy();
      resolve();
    };
    call.on('error', end);
    call.on('response', end);
    call.write(part, end);
  });
}
