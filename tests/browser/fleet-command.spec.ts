import { spawnSync } from 'node:child_process';
import { expect, test } from '@playwright/test';

// No browser here: the command, against the production build, with few devices and with faults of network and power.
test('all credentials and the signing key rotate while devices upload: nothing is lost, doubled or refused', () => {
  test.setTimeout(240_000);
  const ran = spawnSync(
    process.execPath,
    ['lib/launch/fleet.mjs', '--rotate', '--devices', '8', '--pace', '240', '--faults', 'usual'],
    { encoding: 'utf8', timeout: 220_000 },
  );
  expect(ran.stdout + ran.stderr).toContain('lost = 0, duplicated = 0, refused = 0');
  expect(ran.stdout).toMatch(/devices = 8, credentials rotated = 8/);
  expect(ran.status).toBe(0);
});

test('the fleet command says what it takes when it is told something else', () => {
  const ran = spawnSync(process.execPath, ['lib/launch/fleet.mjs', '--devices', 'many', '--rotate'], {
    encoding: 'utf8',
  });
  expect(ran.status).toBe(2);
  expect(ran.stderr).toContain('npm run fleet');
});
