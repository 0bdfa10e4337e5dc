const OUTLINE =
  'M128 8c-2 26-6 40-24 48C74 68 46 74 34 92c-10 16-14 56-16 96M172 8c2 26 6 40 24 48 30 12 58 18 70 36 10 16 14 56 16 96M70 120c4 60 6 110 2 168-2 30-2 52 0 84M230 120c-4 60-6 110-2 168 2 30 2 52 0 84';
const SHOULDER_BLADES = 'M120 92c-20 10-30 40-24 84 8 12 22 8 28-6M180 92c20 10 30 40 24 84-8 12-22 8-28-6';
const COLLARBONES_AND_RIBS =
  'M104 60c18 10 34 14 46 14s28-4 46-14M150 76v120M150 196c-26 6-44 26-58 52M150 196c26 6 44 26 58 52';

/** One view of a body, plain outline, 300 by 376 units. Drawn for eyes only: the sites on it are the words. */
export function BodyOutline({ view }: { view: 'front' | 'back' }) {
  return (
    <svg aria-hidden="true" viewBox="0 0 300 376" className="block w-full" fill="none" strokeLinecap="round">
      <path d={OUTLINE} className="stroke-ink-soft" strokeWidth="2" />
      <g className="stroke-line-strong" strokeWidth="1.5">
        {view === 'back' ? (
          <>
            <path d="M150 44V350" strokeDasharray="2 6" />
            <path d={SHOULDER_BLADES} />
          </>
        ) : (
          <>
            <path d={COLLARBONES_AND_RIBS} />
            <circle cx="108" cy="168" r="4" />
            <circle cx="192" cy="168" r="4" />
          </>
        )}
      </g>
    </svg>
  );
}
