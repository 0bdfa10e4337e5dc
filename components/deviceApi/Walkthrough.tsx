import type { WalkStep } from '@/lib/contract/walkthrough';

/** The blocks of the walk-through, as they are run. */
export function Walkthrough({ steps }: { steps: readonly WalkStep[] }) {
  return (
    <div className="grid gap-6">
      <p className="max-w-line">
        Paste one block after the other into bash. They need curl, openssl 3 and the standard tools, and leave
        their files in the folder you are in.
      </p>
      {steps.map(({ id, title, text, code, either }) => (
        <section key={id} aria-labelledby={`walk-${id}`} className="grid gap-2">
          <h3 id={`walk-${id}`} className="font-semibold">
            {title}
          </h3>
          <p className="max-w-line text-ink-soft">{text}</p>
          <pre
            // biome-ignore lint/a11y/noNoninteractiveTabindex: a block that scrolls must be reached by keyboard
            tabIndex={0}
            className="overflow-x-auto rounded-plate border border-line bg-well px-4 py-3 text-13"
          >
            <code data-step={id} data-either={either} className="font-mono">
              {code}
            </code>
          </pre>
        </section>
      ))}
    </div>
  );
}
