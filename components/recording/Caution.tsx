/** Stands on every page where a clinical decision could lean on a measurement. */
export function Caution({ places = false }: { /** The page marks places to listen. */ places?: boolean }) {
  return (
    <p className="mt-8 max-w-none border-t border-line pt-3 text-13 text-ink-soft">
      Technical measurements only. They do not diagnose.{' '}
      {places ? 'Marks show places to listen; where there is no mark there may still be a sound. ' : ''}
      Follow local policy and the judgement of a licensed clinician.
    </p>
  );
}
