'use client';

import { CopyText } from '@/components/ui/CopyText';
import { Notice } from '@/components/ui/Notice';

/** Recovery codes, the one time that they are shown. */
export function RecoveryCodes({ codes }: { codes: readonly string[] }) {
  return (
    <div className="grid gap-3">
      <Notice tone="care" title="Keep these now: they are shown once">
        Each signs you in once when your authenticator is not at hand. Print them, or keep them where your
        passwords are; not in the phone that holds the authenticator.
      </Notice>
      <ol className="grid grid-cols-2 gap-x-8 gap-y-1 rounded-plate border border-line bg-well px-4 py-3 plate:max-w-[420px]">
        {codes.map((code) => (
          <li key={code} className="mono select-all">
            {code}
          </li>
        ))}
      </ol>
      <CopyText text={codes.join('\n')} shown="All ten" what="recovery codes" />
    </div>
  );
}
