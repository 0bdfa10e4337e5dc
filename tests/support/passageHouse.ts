import { createServer, type Server } from 'node:http';
import type { AddressInfo } from 'node:net';
import { Readable } from 'node:stream';
import { eq } from 'drizzle-orm';
import { GET as jwks } from '@/app/.well-known/jwks.json/route';
import { POST as enrolRoute } from '@/app/api/device/v1/enrol/route';
import { POST as heartbeatRoute } from '@/app/api/device/v1/heartbeat/route';
import { POST as completeRoute } from '@/app/api/device/v1/recordings/[id]/complete/route';
import { POST as slotRoute } from '@/app/api/device/v1/recordings/route';
import { POST as tokenRoute } from '@/app/api/device/v1/token/route';
import { device, deviceModel, encounter, patient, user, ward } from '@/db/schema';
import { createDevice, type Device, type DeviceOptions } from '@/devices/agent/device';
import { enrol } from '@/devices/agent/enrol';
import { CLEAN, type Recipe, synthesise } from '@/devices/synth/chest';
import { encodeWav } from '@/devices/synth/wav';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { issueEnrolmentCode } from '@/lib/enrolment/issueCode';
import { addDevice } from '@/lib/fleet/addDevice';
import { describeModel, type ModelDescription } from '@/lib/fleet/describeModel';
import { closeAnalysis } from '@/lib/http/passage';
import type { Authorized } from '@/lib/platform/authority';
import { newId } from '@/lib/platform/ids';
import { type House, type HouseOptions, openHouse } from './services';

type Handler = (request: Request, route: { params: Promise<Record<string, string>> }) => Promise<Response>;

const ROUTES: [string, RegExp, Handler][] = [
  ['POST', /^\/api\/device\/v1\/enrol$/, enrolRoute],
  ['POST', /^\/api\/device\/v1\/token$/, tokenRoute],
  ['POST', /^\/api\/device\/v1\/heartbeat$/, heartbeatRoute],
  ['POST', /^\/api\/device\/v1\/recordings$/, slotRoute],
  ['POST', /^\/api\/device\/v1\/recordings\/(?<id>[^/]+)\/complete$/, completeRoute],
  ['GET', /^\/\.well-known\/jwks\.json$/, () => jwks()],
];

/** The device API over a real socket: the routes themselves, without the framework around them. */
async function serve(): Promise<{ server: Server; origin: string }> {
  const server = createServer(async (incoming, outgoing) => {
    const url = new URL(incoming.url ?? '/', `http://${incoming.headers.host}`);
    const found = ROUTES.find(([method, path]) => method === incoming.method && path.test(url.pathname));
    if (!found) return void outgoing.writeHead(404).end();
    const request = new Request(url, {
      method: incoming.method ?? 'GET',
      headers: Object.entries(incoming.headers).map(([name, value]): [string, string] => [
        name,
        String(value),
      ]),
      ...(incoming.method === 'GET'
        ? {}
        : { body: Readable.toWeb(incoming) as ReadableStream<Uint8Array>, duplex: 'half' }),
    } as RequestInit);
    const params = { ...(found[1].exec(url.pathname)?.groups ?? {}) };
    const response = await found[2](request, { params: Promise.resolve(params) });
    outgoing.writeHead(response.status, Object.fromEntries(response.headers));
    outgoing.end(Buffer.from(await response.arrayBuffer()));
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  return { server, origin: `http://127.0.0.1:${(server.address() as AddressInfo).port}` };
}

export interface PassageHouse extends House {
  origin: string;
  /** Put a device on the list and give its code. */
  listDevice(
    model?: Partial<ModelDescription>,
  ): Promise<{ id: string; assetTag: string; serialNumber: string; code: string }>;
  /** A device that is enrolled. */
  enrolled(
    model?: Partial<ModelDescription>,
    options?: Partial<DeviceOptions>,
  ): Promise<{ agent: Device; id: string; assetTag: string }>;
  /** A running encounter of a patient of its own, on a ward of its own. */
  encounter(): Promise<{
    id: string;
    number: string;
    patientId: string;
    recordNumber: string;
    familyName: string;
    birthDate: string;
    wardId: string;
  }>;
  /** A clinician of a ward. */
  clinician(
    wardId: string,
  ): Promise<
    Authorized<'session.write'> &
      Authorized<'filing.write'> &
      Authorized<'recording.keep'> &
      Authorized<'bedside.read'>
  >;
}

export const ANY_MODEL: ModelDescription = {
  maker: 'Any',
  name: 'Any',
  sampleRatesHz: [],
  bitDepths: [],
  mediaTypes: ['audio/wav', 'audio/flac'],
  allowLossy: false,
  longestClipSeconds: 600,
  fullScaleNote: null,
  checkIntervalDays: 180,
  signsRequests: true,
};

let serial = 0;

/** A house with a store and the device API on a real socket. */
export async function openPassageHouse(options: HouseOptions = {}): Promise<PassageHouse> {
  const { server, origin } = await serve();
  const house = await openHouse({
    storage: true,
    ...options,
    env: { BELLKEEP_ORIGIN: origin, DEVICE_REQUESTS_PER_MINUTE: '100000', ...options.env },
  });
  const { services } = house;
  const listDevice: PassageHouse['listDevice'] = async (model = {}) => {
    serial++;
    const name = `Any ${serial}`;
    const modelId = await describeModel(services, SERVICE_ACTOR, { ...ANY_MODEL, name, ...model });
    const assetTag = `HM-${9000 + serial}`;
    const serialNumber = `S-${serial}`;
    const id = await addDevice(services, SERVICE_ACTOR, {
      assetTag,
      serialNumber,
      modelId,
      wardId: null,
      udi: null,
      lot: null,
      firmware: null,
    });
    return { id, assetTag, serialNumber, code: (await issueEnrolmentCode(services, SERVICE_ACTOR, id)).code };
  };
  return {
    ...house,
    get fake() {
      return house.fake;
    },
    origin,
    listDevice,
    async enrolled(model, more = {}) {
      const listed = await listDevice(model);
      const agent = await createDevice({
        origin,
        serialNumber: listed.serialNumber,
        stateFolder: null,
        sleep: async () => undefined,
        random: () => 0,
        ...more,
      });
      await enrol(agent, listed.code);
      return { agent, id: listed.id, assetTag: listed.assetTag };
    },
    async encounter() {
      serial++;
      const made = {
        id: newId(),
        number: `E-${70_000 + serial}`,
        patientId: newId(),
        recordNumber: `HGH-900-${serial}`,
        familyName: 'Ashgrove',
        birthDate: '1956-08-17',
        wardId: newId(),
      };
      await services.write(async (tx) => {
        const now = services.clock.now();
        await tx.insert(ward).values({ id: made.wardId, name: `Ward ${serial}`, createdAt: now });
        await tx.insert(patient).values({
          id: made.patientId,
          recordNumber: made.recordNumber,
          familyName: made.familyName,
          givenName: 'Freya',
          birthDate: made.birthDate,
          updatedAt: now,
        });
        await tx.insert(encounter).values({
          id: made.id,
          number: made.number,
          patientId: made.patientId,
          wardId: made.wardId,
          status: 'in-progress',
          startedAt: now - 86_400_000,
          updatedAt: now,
        });
      });
      return made;
    },
    async clinician(wardId) {
      serial++;
      const id = newId();
      const stamp = new Date();
      await services.write(async (tx) => {
        await tx.insert(user).values({
          id,
          name: `Dr Number ${serial}`,
          email: `d${serial}@harrowmere.example`,
          emailVerified: true,
          createdAt: stamp,
          updatedAt: stamp,
        });
      });
      return {
        id,
        name: `Dr Number ${serial}`,
        email: '',
        jobTitle: null,
        roles: ['clinician'],
        wardIds: [wardId],
        sessionId: '',
      } as never;
    },
    async close() {
      await new Promise((resolve) => server.close(resolve));
      server.closeAllConnections();
      await house.close();
      await closeAnalysis();
    },
  };
}

export const clean = (more: Partial<Recipe> = {}): Recipe => ({
  ...CLEAN,
  seconds: 12,
  sampleRateHz: 4000,
  ...more,
});

/** A WAV of a synthesised chest. */
export const chestWav = (recipe: Recipe = clean(), seed = 1): Uint8Array =>
  encodeWav([synthesise(recipe, seed)], { sampleRateHz: recipe.sampleRateHz, bitDepth: 16 });

let clips = 0;
export const clipOf = (bytes: Uint8Array, more: Record<string, unknown> = {}) => ({
  recordingNumber: `clip-${++clips}`,
  bytes,
  mediaType: 'audio/wav',
  recordedAt: Date.now(),
  ...more,
});

export const deviceRow = async (house: PassageHouse, id: string) => {
  const [row] = await house.services.read
    .select({ device, model: deviceModel })
    .from(device)
    .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
    .where(eq(device.id, id));
  if (!row) throw new Error('no such device');
  return row;
};
