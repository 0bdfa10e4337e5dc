import { randomBytes } from 'node:crypto';
import { existsSync, mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { ensureDebian } from '../support/debian';
import { BUCKET, type Foreign, startForeign } from './foreignClients';

// The fake is only worth something if clients of other makers take it for a store. These are Debian's packages.

const PACKAGES = ['awscli', 's3cmd', 'rclone', 'python3-boto3'];
const LEFT_OUT = process.env.BELLKEEP_WITHOUT_FOREIGN_CLIENTS === '1';
const ODD = 'with space/ünïcode ☃ +&=.wav';

let foreign: Foreign;
let stopped: number | null = null;

/** A small tree: an ordinary, an empty, a large file and one with an odd name. */
function makeTree(root: string): void {
  mkdirSync(join(root, 'with space'), { recursive: true });
  writeFileSync(join(root, 'plain.txt'), 'plain\n');
  writeFileSync(join(root, 'empty'), '');
  writeFileSync(join(root, 'large.bin'), randomBytes(22_000_000));
  writeFileSync(join(root, ODD), 'odd\n');
}

const sameTree = (home: string, other: string): boolean =>
  ['plain.txt', 'empty', 'large.bin', ODD].every((name) =>
    readFileSync(join(home, 'tree', name)).equals(readFileSync(join(home, other, name))),
  );

if (LEFT_OUT) {
  test("other makers' clients were deliberately left out", () => {
    console.warn(
      `BELLKEEP_WITHOUT_FOREIGN_CLIENTS=1: ${PACKAGES.join(', ')} were not tried against the storage fake`,
    );
    expect(LEFT_OUT).toBe(true);
  });
} else {
  describe('clients of other makers', () => {
    beforeAll(async () => {
      if (!ensureDebian(PACKAGES)) {
        throw new Error(
          `${PACKAGES.join(', ')} are needed and could not be installed: run as root on Debian, install them, or set BELLKEEP_WITHOUT_FOREIGN_CLIENTS=1`,
        );
      }
      foreign = await startForeign();
      makeTree(join(foreign.home, 'tree'));
    }, 600_000);

    afterAll(async () => {
      if (foreign !== undefined) stopped = await foreign.stop();
      // npm passes SIGTERM on, and the fake ends by itself.
      expect(stopped).not.toBeNull();
    });

    test('awscli copies, lists, syncs, presigns and removes', async () => {
      const aws = (...args: string[]) => foreign.ok('aws', ['--endpoint-url', foreign.url, ...args]);
      const at = `s3://${BUCKET}/aws`;
      await aws('s3', 'sync', 'tree', at, '--no-progress');
      expect(await aws('s3', 'sync', 'tree', at, '--no-progress')).toBe('');
      const listed = await aws('s3', 'ls', '--recursive', at);
      expect(listed).toContain(`aws/${ODD}`);
      expect(listed).toMatch(/ 22000000 aws\/large\.bin/);
      await aws('s3', 'cp', '--recursive', at, 'aws-back', '--no-progress');
      expect(sameTree(foreign.home, 'aws-back')).toBe(true);
      await aws('s3', 'mv', `${at}/large.bin`, `${at}/moved.bin`, '--no-progress');
      const address = (await aws('s3', 'presign', `${at}/${ODD}`, '--expires-in', '60')).trim();
      expect(await (await fetch(address)).text()).toBe('odd\n');
      expect((await fetch(address.replace('X-Amz-Expires=60', 'X-Amz-Expires=61'))).status).toBe(403);
      await aws('s3', 'rm', '--recursive', at);
      expect((await foreign.run('aws', ['--endpoint-url', foreign.url, 's3', 'ls', at])).code).toBe(1);
    }, 240_000);

    test('awscli declares checksums, locks an object and cannot remove it', async () => {
      const api = (...args: string[]) => foreign.ok('aws', ['--endpoint-url', foreign.url, 's3api', ...args]);
      const put = ['put-object', '--bucket', BUCKET, '--body', 'tree/plain.txt', '--key'];
      for (const algorithm of ['CRC32', 'CRC32C', 'SHA1', 'SHA256']) {
        const stored = JSON.parse(await api(...put, 'api/sum', '--checksum-algorithm', algorithm));
        const read = JSON.parse(
          await api(
            'get-object',
            '--bucket',
            BUCKET,
            '--key',
            'api/sum',
            '--checksum-mode',
            'ENABLED',
            'sum.out',
          ),
        );
        expect(read[`Checksum${algorithm}`]).toBe(stored[`Checksum${algorithm}`]);
        expect(read[`Checksum${algorithm}`]).toBeDefined();
      }
      const until = new Date(Date.now() + 3_600_000).toISOString();
      const lock = ['--object-lock-mode', 'COMPLIANCE', '--object-lock-retain-until-date', until];
      await api(...put, 'api/locked', '--checksum-algorithm', 'SHA256', ...lock);
      const remove = [
        '--endpoint-url',
        foreign.url,
        's3api',
        'delete-object',
        '--bucket',
        BUCKET,
        '--key',
        'api/locked',
      ];
      const refused = await foreign.run('aws', remove);
      expect([refused.code, refused.err]).toEqual([254, expect.stringContaining('AccessDenied')]);
    }, 240_000);

    test('s3cmd makes a bucket, puts, syncs, looks, copies, gets and removes', async () => {
      const s3cmd = (...args: string[]) => foreign.ok('s3cmd', ['--no-progress', ...args]);
      const bucket = 's3://made-by-s3cmd';
      await s3cmd('mb', bucket);
      expect(await s3cmd('ls')).toContain(bucket);
      await s3cmd('sync', 'tree/', `${bucket}/tree/`);
      expect(await s3cmd('sync', 'tree/', `${bucket}/tree/`)).not.toContain('upload:');
      expect(await s3cmd('ls', '-r', bucket)).toContain(`${bucket}/tree/${ODD}`);
      await s3cmd('put', '--multipart-chunk-size-mb=6', 'tree/large.bin', `${bucket}/in-parts`);
      expect(await s3cmd('info', `${bucket}/in-parts`)).toMatch(/File size: 22000000/);
      expect(await s3cmd('info', bucket)).toMatch(/Location: +us-east-1/);
      await s3cmd('cp', `${bucket}/in-parts`, `${bucket}/copy`);
      await s3cmd('modify', '--add-header=x-amz-meta-note:n', `${bucket}/copy`);
      expect(await s3cmd('info', `${bucket}/copy`)).toContain('x-amz-meta-note: n');
      mkdirSync(join(foreign.home, 's3cmd-back'));
      await s3cmd('sync', `${bucket}/tree/`, 's3cmd-back/');
      expect(sameTree(foreign.home, 's3cmd-back')).toBe(true);
      await s3cmd('get', `${bucket}/copy`, 'copy.out');
      expect(readFileSync(join(foreign.home, 'copy.out')).length).toBe(22_000_000);
      const address = (await s3cmd('signurl', `${bucket}/tree/${ODD}`, '+60')).trim();
      expect(await (await fetch(address)).text()).toBe('odd\n');
      await s3cmd('del', `${bucket}/copy`);
      expect((await foreign.run('s3cmd', ['rb', bucket])).err).toContain('BucketNotEmpty');
      await s3cmd('del', '-r', '--force', bucket);
      await s3cmd('rb', bucket);
      expect(await s3cmd('ls')).not.toContain(bucket);
    }, 240_000);

    test.each(['other', 'plain'])(
      'rclone (%s) copies, checks, reads, moves and removes',
      async (remote) => {
        const rclone = (...args: string[]) => foreign.ok('rclone', args);
        const at = `${remote}:made-by-rclone-${remote}/tree`;
        await rclone('copy', 'tree', at);
        const synced = await foreign.run('rclone', ['sync', '-v', 'tree', at]);
        expect([synced.code, synced.err]).toEqual([0, expect.not.stringContaining('Copied')]);
        await rclone('check', 'tree', at);
        await rclone('check', '--download', 'tree', at);
        expect(await rclone('ls', at)).toContain(ODD);
        expect(await rclone('cat', `${at}/${ODD}`)).toBe('odd\n');
        expect(await rclone('cat', '--offset', '1', '--count', '2', `${at}/plain.txt`)).toBe('la');
        await rclone(
          'copyto',
          '--s3-upload-cutoff',
          '5M',
          '--s3-chunk-size',
          '5M',
          'tree/large.bin',
          `${at}/in-parts`,
        );
        await rclone('moveto', `${at}/in-parts`, `${at}/moved`);
        await rclone('copyto', `${at}/moved`, `${remote}.out`);
        expect(
          readFileSync(join(foreign.home, `${remote}.out`)).equals(
            readFileSync(join(foreign.home, 'tree/large.bin')),
          ),
        ).toBe(true);
        await foreign.ok('rclone', ['rcat', `${at}/streamed`], 'from a pipe');
        expect(await rclone('cat', `${at}/streamed`)).toBe('from a pipe');
        await rclone('deletefile', `${at}/streamed`);
        expect(await rclone('lsf', at)).not.toContain('streamed');
        await rclone('purge', `${remote}:made-by-rclone-${remote}`);
        expect(await rclone('lsd', `${remote}:`)).not.toContain('made-by-rclone');
      },
      240_000,
    );

    test('boto3 uploads in parts, pages, presigns with both signatures and removes', async () => {
      const script = fileURLToPath(new URL('foreignBoto.py', import.meta.url));
      expect(await foreign.ok('python3', [script])).toBe('all as it should be\n');
      expect(existsSync(join(foreign.home, 'store'))).toBe(true);
    }, 240_000);
  });
}
