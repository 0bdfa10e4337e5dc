import { createHmac } from 'node:crypto';
import { eq } from 'drizzle-orm';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { POST as pauseRoute } from '@/app/api/webhooks/[id]/pause/route';
import { POST as removeRoute } from '@/app/api/webhooks/[id]/remove/route';
import { POST as rotateRoute } from '@/app/api/webhooks/[id]/rotate/route';
import { POST as testRoute } from '@/app/api/webhooks/[id]/test/route';
import { POST as repeatRoute } from '@/app/api/webhooks/deliveries/[id]/repeat/route';
import { POST as addRoute } from '@/app/api/webhooks/route';
import { idempotencyKey, outbox, webhook, webhookDelivery } from '@/db/schema';
import { appendEntries } from '@/lib/custody/append';
import type { NewEntry } from '@/lib/custody/entry';
import { runOutboxOnce } from '@/lib/platform/outbox';
import type { Resolved } from '@/lib/platform/outside';
import { addWebhook } from '@/lib/webhooks/addWebhook';
import { deliverWebhook } from '@/lib/webhooks/deliver';
import { DELIVERY, fanOut } from '@/lib/webhooks/fanOut';
import { forgetDeliveries } from '@/lib/webhooks/forgetDeliveries';
import { DeliveryFilter, readDeliveries, readWebhook } from '@/lib/webhooks/readWebhooks';
import { call, problemOf } from '../../support/call';
import { entriesOf } from '../../support/entries';
import { type OutsideServer, outsideServer } from '../../support/outsideServer';
import { authorityOf, signedIn } from '../../support/people';
import { type House, openHouse } from '../../support/services';

let house: House;
let admin: Awaited<ReturnType<typeof signedIn>>;
let receiver: OutsideServer;
let answers = 200;
beforeEach(async () => {
  answers = 200;
  receiver = await outsideServer(({ path }, response) => {
    if (path === '/moved') response.writeHead(302, { location: `${receiver.origin}/elsewhere` }).end();
    else response.writeHead(answers).end('thank you, Mrs Ashgrove');
  });
  house = await openHouse({ env: { PRIVATE_ADDRESSES_ALLOWED: '127.0.0.0/8' } });
  admin = await signedIn(house, { roles: ['itadmin'] });
  // The first look sets the cursor to the log's end.
  await fanOut(house.services);
});
afterEach(async () => {
  await receiver.close();
  await house.close();
});

interface Added {
  id: string;
  secret: string;
}
const add = (body: Record<string, unknown> = {}, headers = {}) =>
  call(addRoute, {
    body: {
      name: 'Ward board',
      url: `${receiver.origin}/hook`,
      events: ['recording.judged', 'device.lost'],
      ...body,
    },
    cookie: admin.cookie,
    headers,
  });
const added = async (body: Record<string, unknown> = {}) => (await (await add(body)).json()) as Added;
const act = (route: Parameters<typeof call>[0], id: string, body: unknown = {}) =>
  call(route, { params: { id }, body, cookie: admin.cookie });

const JUDGED: NewEntry = {
  kind: 'measured',
  actor: { kind: 'service', id: 'bellkeep', label: 'Bellkeep' },
  subjects: [
    { kind: 'recording', id: 'r-1' },
    { kind: 'patient', id: 'p-1' },
  ],
  detail: {
    number: '7K3F-92QX',
    verdict: 'repeat',
    findings: [{ code: 'clipped', severity: 'repeat' }],
    note: 'Freya Ashgrove',
  },
};
const LOST: NewEntry = {
  kind: 'device-state-changed',
  actor: { kind: 'person', id: 'x', label: 'Ines' },
  subjects: [{ kind: 'device', id: 'd-1' }],
  detail: { reason: 'left in a taxi' },
  before: { state: 'in-service' },
  after: { state: 'lost' },
};
const happens = (...entries: NewEntry[]) =>
  house.services.write(async (tx) => void (await appendEntries(tx, house.clock.now(), entries)));
const work = (resolve?: () => Promise<Resolved[]>) =>
  runOutboxOnce(
    house.services,
    { [DELIVERY]: (payload) => deliverWebhook(house.services, payload, resolve) },
    { only: DELIVERY },
  );
/** Something happens, is told, and is delivered as far as it will go. */
async function told(...entries: NewEntry[]) {
  await happens(...entries);
  await fanOut(house.services);
  await work();
}
const deliveries = async (id: string, view = 'all') =>
  (
    await readDeliveries(
      house.services,
      authorityOf<'connections.read'>(admin),
      id,
      DeliveryFilter.parse({ view }),
    )
  ).rows;
const line = (id: string) => readWebhook(house.services, authorityOf<'connections.read'>(admin), id);

/** As a receiver checks it. */
function signedBy(secret: string, nth = -1): boolean {
  const got = receiver.asked.at(nth);
  if (!got) return false;
  const { headers, body } = got;
  const text = `${headers['webhook-id']}.${headers['webhook-timestamp']}.${body}`;
  const mine = `v1,${createHmac('sha256', secret).update(text).digest('base64')}`;
  return String(headers['webhook-signature']).split(' ').includes(mine);
}

describe('an event', () => {
  test('is told once, signed over id, time and body, with no patient in it', async () => {
    const { secret, id } = await added();
    await told(JUDGED);
    await fanOut(house.services);
    await work();
    expect(receiver.asked).toHaveLength(1);
    const [got] = receiver.asked;
    expect(JSON.parse(got?.body ?? '')).toMatchObject({
      id: got?.headers['webhook-id'],
      type: 'recording.judged',
      data: { recording: '7K3F-92QX', verdict: 'repeat', findings: ['clipped'] },
    });
    expect(got?.body).not.toMatch(/Ashgrove|p-1/);
    expect(signedBy(secret)).toBe(true);
    expect(signedBy('another secret')).toBe(false);
    const sent = Number(got?.headers['webhook-timestamp']) * 1000;
    expect(Math.abs(sent - house.clock.now())).toBeLessThan(5000);
    expect(await deliveries(id)).toMatchObject([{ state: 'delivered', status: 200, tries: 1 }]);
    expect((await line(id))?.waiting).toBe(0);
  });

  test('that nobody asked for, or that happened before, is not told', async () => {
    await happens(JUDGED);
    await added({ events: ['policy.changed'] });
    house.clock.advance(1000);
    await told(LOST);
    expect(receiver.asked).toEqual([]);
  });

  test.each(['device-state-changed', 'device-lost'] as const)(
    'of a lost device (%s) is two, to whoever asked for both',
    async (kind) => {
      await added({ events: ['device.lost', 'device.state-changed'] });
      await told({ ...LOST, kind });
      expect(receiver.asked.map(({ body }) => (JSON.parse(body) as { type: string }).type).sort()).toEqual([
        'device.lost',
        'device.state-changed',
      ]);
      expect(receiver.asked[0]?.body).not.toContain('taxi');
    },
  );

  test('is told once by several processes that look at the same moment', async () => {
    await added();
    await happens(JUDGED, LOST);
    await Promise.all([1, 2, 3].map(() => fanOut(house.services)));
    await Promise.all([work(), work()]);
    expect(receiver.asked).toHaveLength(2);
  });

  test('whose change was rolled back is never told', async () => {
    await added();
    await house.services
      .write(async (tx) => {
        await appendEntries(tx, house.clock.now(), [JUDGED]);
        throw new Error('no');
      })
      .catch(() => undefined);
    await fanOut(house.services);
    expect(await house.services.read.select().from(webhookDelivery)).toEqual([]);
  });
});

describe('a receiver that does not take it', () => {
  test('is tried again, later each time, with the same id; then it is set aside and can be sent again', async () => {
    const { id } = await added();
    answers = 503;
    await told(JUDGED);
    expect(await deliveries(id)).toMatchObject([
      { state: 'waiting', status: 503, failure: 'it answers 503', tries: 1 },
    ]);
    for (let i = 0; i < 11; i++) {
      house.clock.advance(3_600_001);
      await work();
    }
    expect(receiver.asked).toHaveLength(12);
    expect(new Set(receiver.asked.map(({ headers }) => headers['webhook-id'])).size).toBe(1);
    const [dead] = await deliveries(id, 'set-aside');
    expect(dead).toMatchObject({ state: 'set-aside', tries: 12 });
    house.clock.advance(86_400_000);
    await work();
    expect(receiver.asked).toHaveLength(12);
    answers = 204;
    admin = await signedIn(house, { roles: ['itadmin'] });
    expect((await act(repeatRoute, dead?.id ?? '')).status).toBe(200);
    expect((await problemOf(await act(repeatRoute, dead?.id ?? ''))).code).toBe('not-possible');
    await work();
    expect(await deliveries(id)).toMatchObject([{ state: 'delivered', status: 204 }]);
    expect((await entriesOf(house)).at(-1)).toMatchObject({ kind: 'delivery-repeated' });
  });

  test('had it all the same when we died after its answer: it gets it again with the same id', async () => {
    await added();
    await happens(JUDGED);
    await fanOut(house.services);
    const [piece] = await house.services.read.select().from(outbox).where(eq(outbox.kind, DELIVERY));
    // Delivered, and the process died before the outbox knew.
    await deliverWebhook(house.services, piece?.payload ?? {});
    await work();
    expect(receiver.asked).toHaveLength(2);
    expect(receiver.asked[0]?.headers['webhook-id']).toBe(receiver.asked[1]?.headers['webhook-id']);
  });

  test('that redirects is not followed', async () => {
    const { id } = await added({ url: `${receiver.origin}/moved` });
    await told(JUDGED);
    expect(receiver.asked.map(({ path }) => path)).toEqual(['/moved']);
    expect(await deliveries(id)).toMatchObject([{ failure: 'it redirects, which is not followed' }]);
  });

  test('keeps no mail waiting', async () => {
    await added();
    answers = 500;
    await told(JUDGED);
    let sent = 0;
    await house.services.write(async (tx) => {
      const { enqueueMail } = await import('@/lib/mail/enqueue');
      await enqueueMail(tx, house.clock.now(), { to: 'a@b.example', subject: 's', text: 't' });
    });
    await runOutboxOnce(house.services, { mail: async () => void sent++ }, { except: DELIVERY });
    expect(sent).toBe(1);
  });

  test('says nothing that we keep', async () => {
    const { id } = await added();
    answers = 400;
    await told(JUDGED);
    expect(JSON.stringify([await deliveries(id), house.log])).not.toContain('Ashgrove');
  });
});

describe('an address', () => {
  test.each([
    'http://127.0.0.1.nip.example@10.0.0.1/',
    'http://10.0.0.1/hook',
    'http://[fd00::1]/hook',
    'http://169.254.169.254/latest/meta-data',
    'ftp://example.org/',
    'hook',
  ])('such as %s is refused when it is typed', async (url) => {
    const answer = await add({ url });
    const { code, body } = await problemOf(answer);
    expect(code).toBe('body-invalid');
    expect(body.errors).toEqual([expect.objectContaining({ path: 'url' })]);
    expect(await house.services.read.select().from(webhook)).toEqual([]);
  });

  test('that leads inside by the time of a delivery is not called', async () => {
    const { port } = new URL(receiver.origin);
    const outside = async (): Promise<Resolved[]> => [{ address: '127.0.0.1', family: 4 }];
    const inside = async (): Promise<Resolved[]> => [{ address: '10.0.0.1', family: 4 }];
    const { id } = await addWebhook(
      house.services,
      authorityOf<'connections.write'>(admin),
      { name: 'Turncoat', url: `http://turncoat.example:${port}/`, events: ['recording.judged'] },
      undefined,
      outside,
    );
    await happens(JUDGED);
    await fanOut(house.services);
    await work(inside);
    expect(receiver.asked).toEqual([]);
    expect((await deliveries(id))[0]?.failure).toContain('which is inside');
    house.clock.advance(3_600_000);
    await work(outside);
    expect(receiver.asked).toHaveLength(1);
  });

  test('is tried with a test event, once, and what came of it stands in the list', async () => {
    const { id, secret } = await added();
    expect(await (await act(testRoute, id)).json()).toEqual({ ok: true, status: 200, failure: null });
    expect(signedBy(secret)).toBe(true);
    answers = 401;
    expect(await (await act(testRoute, id)).json()).toEqual({
      ok: false,
      status: 401,
      failure: 'it answers 401',
    });
    expect((await deliveries(id)).map(({ state, type }) => [state, type])).toEqual([
      ['failed', 'webhook.test'],
      ['delivered', 'webhook.test'],
    ]);
    house.clock.advance(3_600_000);
    await work();
    expect(receiver.asked).toHaveLength(2);
  });
});

describe('a pause', () => {
  test('holds everything back and loses nothing', async () => {
    const { id } = await added();
    await act(pauseRoute, id, { paused: true, version: 1 });
    await told(JUDGED);
    await told(LOST);
    expect(receiver.asked).toEqual([]);
    expect((await deliveries(id, 'waiting')).map(({ state }) => state)).toEqual(['held', 'held']);
    expect((await line(id))?.waiting).toBe(2);
    expect((await act(pauseRoute, id, { paused: false, version: 1 })).status).toBe(409);
    await act(pauseRoute, id, { paused: false, version: 2 });
    await work();
    expect(receiver.asked).toHaveLength(2);
    expect((await deliveries(id)).map(({ state }) => state)).toEqual(['delivered', 'delivered']);
  });
});

describe('a secret', () => {
  test('is shown once, and lies sealed', async () => {
    const headers = { 'idempotency-key': 'add-webhook-once' };
    const first = (await (await add({}, headers)).json()) as Added;
    expect(await (await add({}, headers)).json()).toEqual({ id: first.id, secret: null });
    const everything = JSON.stringify([
      await house.services.read.select().from(webhook),
      await house.services.read.select().from(idempotencyKey),
      await entriesOf(house),
      house.log,
    ]);
    expect(everything).not.toContain(first.secret);
  });

  test('that is rotated signs beside the new one for a day', async () => {
    const { id, secret } = await added();
    const fresh = (await (await act(rotateRoute, id, { version: 1, atOnce: false })).json()) as Added;
    await told(JUDGED);
    expect([signedBy(secret), signedBy(fresh.secret)]).toEqual([true, true]);
    house.clock.advance(86_400_001);
    await told(LOST);
    expect([signedBy(secret), signedBy(fresh.secret)]).toEqual([false, true]);
  });

  test('that is known to somebody signs no more at once', async () => {
    const { id, secret } = await added();
    const fresh = (await (await act(rotateRoute, id, { version: 1, atOnce: true })).json()) as Added;
    await told(JUDGED);
    expect([signedBy(secret), signedBy(fresh.secret)]).toEqual([false, true]);
  });
});

test('what is removed is told nothing more, not even what waited', async () => {
  const { id } = await added();
  await happens(JUDGED);
  await fanOut(house.services);
  const remove = () => act(removeRoute, id, { version: 1, reason: 'Contract ended' });
  const both = await Promise.all([remove(), remove()]);
  expect(both.map(({ status }) => status).sort()).toEqual([200, 404]);
  await work();
  await told(LOST);
  expect(receiver.asked).toEqual([]);
  expect(await line(id)).toBeNull();
});

test('deliveries are forgotten after as long as policy says, but for those on their way', async () => {
  const { id } = await added();
  await told(JUDGED);
  answers = 500;
  await told(LOST);
  house.clock.advance(31 * 86_400_000);
  await forgetDeliveries(house.services);
  expect((await deliveries(id)).map(({ type }) => type)).toEqual(['device.lost']);
});
