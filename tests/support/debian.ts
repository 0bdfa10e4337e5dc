import { spawnSync } from 'node:child_process';
import { existsSync } from 'node:fs';

const APT_GET = '/usr/bin/apt-get';

function missing(packages: readonly string[]): string[] {
  return packages.filter((name) => {
    const asked = spawnSync('/usr/bin/dpkg-query', ['-s', name], { encoding: 'utf8' });
    return asked.status !== 0 || !asked.stdout.includes('Status: install ok installed');
  });
}

function aptGet(args: readonly string[]): boolean {
  const env = { ...process.env, DEBIAN_FRONTEND: 'noninteractive' };
  // Another test file may be installing at this moment: wait for it.
  const ran = spawnSync(APT_GET, ['-o', 'DPkg::Lock::Timeout=300', '-q', ...args], {
    env,
    encoding: 'utf8',
  });
  if (ran.status !== 0) console.error(`apt-get ${args.join(' ')}:\n${ran.stdout}\n${ran.stderr}`);
  return ran.status === 0;
}

/**
 * See to it that Debian packages are there, installing them where this process may.
 *
 * @returns false where one is missing and could not be installed: no root, no apt-get, or no archive in reach
 */
export function ensureDebian(packages: readonly string[]): boolean {
  const wanted = missing(packages);
  if (wanted.length === 0) return true;
  if (process.getuid?.() !== 0 || !existsSync(APT_GET)) return false;
  const install = ['install', '-y', '--no-install-recommends', ...wanted];
  // The lists may be old or absent; without them fetched anew the archive's files may be gone.
  if (!aptGet(['update']) || !aptGet(install)) return false;
  return missing(packages).length === 0;
}
