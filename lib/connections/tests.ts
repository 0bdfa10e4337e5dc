import { createHash, randomBytes, randomUUID } from 'node:crypto';
import type { Authorized } from '@/lib/platform/authority';
import { readConnection } from '@/lib/platform/connectionSetting';
import { outsideJson } from '@/lib/platform/outside';
import type { Services } from '@/lib/platform/services';
import type { CheckStep } from '@/lib/storage/port';
import { createSteps, StepFailed } from './steps';

export const CONNECTIONS = ['storage', 'mail', 'record-system', 'single-sign-on'] as const;
export type ConnectionKind = (typeof CONNECTIONS)[number];
type Needs = Pick<Services, 'read' | 'storage' | 'mail' | 'env' | 'secrets' | 'clock'>;
type By = Authorized<'connections.write'>;

const PREFIX = 'checks/';

/** Put, read, list and remove an object for real; then what the store does about wrong bytes, and about locks. */
async function testStorage(services: Needs): Promise<CheckStep[]> {
  const report = await services.storage.check(PREFIX);
  const { steps, step } = createSteps();
  if (report.ok) await step('checksum', () => tryWrongBytes(services));
  return [
    ...report.steps,
    ...steps,
    {
      name: 'lock',
      ok: true,
      detail: report.objectLock
        ? 'object lock is on: originals are locked'
        : 'no object lock: originals are kept without one, and each entry says so',
    },
  ];
}

/** Bytes of the announced length with another hash, through an address such as devices get. */
async function tryWrongBytes(services: Needs): Promise<string> {
  const announced = randomBytes(32);
  const key = `${PREFIX}wrong-${randomUUID()}`;
  const { url, headers } = await services.storage.presignPut({
    key,
    contentLength: 32,
    contentType: 'application/octet-stream',
    sha256: createHash('sha256').update(announced).digest(),
    expiresSeconds: 60,
    nowMs: services.clock.now(),
  });
  const { 'content-length': _length, host: _host, ...fields } = headers;
  const answer = await fetch(url, {
    method: 'PUT',
    headers: fields,
    body: new Uint8Array(randomBytes(32)),
    redirect: 'manual',
    signal: AbortSignal.timeout(10_000),
  });
  await answer.body?.cancel();
  await services.storage.remove(key);
  return answer.ok
    ? 'the store takes bytes with another SHA-256; ours decides when they are read'
    : 'bytes with another SHA-256 are refused';
}

/** A real message to whoever tests. */
async function testMail(services: Needs, by: By): Promise<CheckStep[]> {
  const { steps, step } = createSteps();
  await step('hand a message over', async () => {
    await services.mail.send({
      to: by.email,
      subject: 'Bellkeep can send mail',
      text: `This message was sent from the Key room to test the mail connection.\n\nBellkeep, ${services.env.BELLKEEP_HOSPITAL}`,
    });
    return services.mail.kind === 'smtp'
      ? `the mail server took a message to ${by.email}`
      : `written to the mail folder; no mail server is set`;
  });
  return steps;
}

/** FHIR R4: its capabilities, and whether patients can be searched for. No patient is kept. */
async function testRecordSystem(services: Needs): Promise<CheckStep[]> {
  const { steps, step } = createSteps();
  const found = await readConnection(services, 'record-system');
  await step('settings', async () => {
    if (!found) throw new StepFailed('no address is set');
    return found.settings.baseUrl;
  });
  const headers = {
    accept: 'application/fhir+json',
    ...(found?.secret ? { authorization: `Bearer ${found.secret}` } : {}),
  };
  const ask = (path: string) =>
    outsideJson(services.env, `${found?.settings.baseUrl ?? ''}${path}`, { headers });
  await step('capabilities', async () => {
    const told = await ask('/metadata');
    if (told.resourceType !== 'CapabilityStatement') throw new StepFailed('it is no FHIR server');
    const version = typeof told.fhirVersion === 'string' ? told.fhirVersion.slice(0, 12) : 'unknown';
    if (!version.startsWith('4.')) throw new StepFailed(`it speaks FHIR ${version}; R4 is needed`);
    return `FHIR ${version}`;
  });
  await step('search patients', async () => {
    const bundle = await ask('/Patient?_count=1');
    if (bundle.resourceType !== 'Bundle') throw new StepFailed('the answer is no bundle');
    return 'patients can be searched for';
  });
  return steps;
}

/** OpenID Connect Discovery 1.0: what the provider says of itself, and its keys. */
async function testSignOn(services: Needs): Promise<CheckStep[]> {
  const { steps, step } = createSteps();
  const found = await readConnection(services, 'single-sign-on');
  await step('settings', async () => {
    if (!found) throw new StepFailed('no provider is set');
    return found.settings.issuer;
  });
  let told: Record<string, unknown> = {};
  await step('discovery', async () => {
    const issuer = found?.settings.issuer ?? '';
    told = await outsideJson(services.env, `${issuer}/.well-known/openid-configuration`);
    if (String(told.issuer).replace(/\/+$/, '') !== issuer)
      throw new StepFailed('it names itself otherwise than it is set here');
    for (const name of ['authorization_endpoint', 'token_endpoint', 'jwks_uri'])
      if (typeof told[name] !== 'string') throw new StepFailed(`it does not say its ${name}`);
    return 'it names its addresses';
  });
  await step('proof key', async () => {
    const methods = told.code_challenge_methods_supported;
    if (!Array.isArray(methods) || !methods.includes('S256'))
      throw new StepFailed('it does not say that it takes PKCE with S256 (RFC 7636)');
    return 'PKCE with S256';
  });
  await step('keys', async () => {
    const { keys } = await outsideJson(services.env, String(told.jwks_uri));
    if (!Array.isArray(keys) || keys.length === 0) throw new StepFailed('it has no keys');
    return `${keys.length} ${keys.length === 1 ? 'key' : 'keys'}`;
  });
  return steps;
}

export const TESTS: Record<ConnectionKind, (services: Needs, by: By) => Promise<CheckStep[]>> = {
  storage: testStorage,
  mail: testMail,
  'record-system': testRecordSystem,
  'single-sign-on': testSignOn,
};
