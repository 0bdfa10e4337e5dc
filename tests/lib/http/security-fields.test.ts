import { NextRequest } from 'next/server';
import { afterEach, describe, expect, test, vi } from 'vitest';
import { config, proxy } from '@/proxy';

afterEach(() => vi.unstubAllEnvs());

const fieldsOf = (path = '/bench?ward=w', headers: Record<string, string> = {}) => {
  const answer = proxy(new NextRequest(`https://bellkeep.test${path}`, { headers }));
  return answer.headers;
};
const policyOf = (headers: Headers): Map<string, string[]> =>
  new Map(
    (headers.get('content-security-policy') ?? '').split('; ').map((line) => {
      const [name = '', ...values] = line.split(' ');
      return [name, values];
    }),
  );

describe('a page', () => {
  test('runs only scripts that carry the nonce of this very answer', () => {
    const [first, second] = [policyOf(fieldsOf()), policyOf(fieldsOf())];
    const scripts = first.get('script-src') ?? [];
    expect(scripts.filter((source) => source.startsWith("'nonce-"))).toHaveLength(1);
    expect(scripts).not.toContain("'unsafe-inline'");
    expect(scripts).not.toContain("'unsafe-eval'");
    expect(second.get('script-src')).not.toEqual(scripts);
    expect(first.get('default-src')).toEqual(["'none'"]);
  });

  test('is embedded by nobody, has no other base, and posts to nowhere else', () => {
    const policy = policyOf(fieldsOf());
    expect(policy.get('frame-ancestors')).toEqual(["'none'"]);
    expect(policy.get('base-uri')).toEqual(["'none'"]);
    expect(policy.get('form-action')).toEqual(["'self'"]);
    expect(policy.get('object-src')).toBeUndefined();
  });

  test('may fetch from the store by the address that browsers use, and from nowhere else', () => {
    vi.stubEnv('S3_ENDPOINT', 'http://store.internal:9000');
    vi.stubEnv('S3_PUBLIC_ENDPOINT', 'https://store.hospital.example/path');
    expect(policyOf(fieldsOf()).get('connect-src')).toEqual(["'self'", 'https://store.hospital.example']);
    vi.stubEnv('S3_PUBLIC_ENDPOINT', '');
    expect(policyOf(fieldsOf()).get('connect-src')).toEqual(["'self'", 'http://store.internal:9000']);
  });

  test('tells nobody where one came from and asks for no device', () => {
    const headers = fieldsOf();
    expect(headers.get('referrer-policy')).toBe('no-referrer');
    expect(headers.get('x-content-type-options')).toBe('nosniff');
    expect(headers.get('permissions-policy')).toContain('microphone=()');
    expect(headers.get('cross-origin-opener-policy')).toBe('same-origin');
  });

  test('insists on TLS where the house has it', () => {
    vi.stubEnv('BELLKEEP_ORIGIN', 'https://bellkeep.test');
    expect(fieldsOf().get('strict-transport-security')).toMatch(/^max-age=\d{8}/);
    vi.stubEnv('BELLKEEP_ORIGIN', 'http://localhost:3000');
    expect(fieldsOf().get('strict-transport-security')).toBeNull();
  });

  test('knows its own address and nonce from us and not from the caller', () => {
    const headers = fieldsOf('/bench?ward=w', { 'x-bellkeep-path': '//evil.example', 'x-nonce': 'mine' });
    // Next hands changed request fields on under this prefix.
    expect(headers.get('x-middleware-request-x-bellkeep-path')).toBe('/bench?ward=w');
    expect(headers.get('x-middleware-request-x-nonce')).not.toBe('mine');
  });
});

describe('the matcher', () => {
  const matches = (path: string) => config.matcher.some((pattern) => new RegExp(`^${pattern}$`).test(path));

  test.each(['/', '/bench', '/sign-in', '/recordings/7K3F-92QX', '/apiary'])('covers %s', (path) => {
    expect(matches(path)).toBe(true);
  });

  // A route that is covered has its request body cut at 10 MB, without a word (Next 16).
  test.each([
    '/api/device/v1/recordings',
    '/api/people',
    '/_next/static/chunks/a.js',
    '/.well-known/jwks.json',
    '/icon.svg',
  ])('leaves %s alone', (path) => {
    expect(matches(path)).toBe(false);
  });
});
