/** What a reader should know of the screening of a table. */
import type { NoticeOut } from './notices.ts';
import type { ResolvedCrystal } from './resolved-scenario.ts';

/** `name` begins the sentences: "The table", or which of two it is. */
export function screeningNotices(
  { screened, twin, electronsPerCell }: ResolvedCrystal,
  name = 'The table',
): NoticeOut[] {
  if (twin === 'used') return [{ code: 'screened-twin', detail: twinSentences(name, electronsPerCell) }];
  if (screened) return [];
  const offer = twin === 'offered' ? ' "screening": "in-medium" computes a screened twin from it.' : '';
  return [
    {
      code: 'unscreened-table',
      detail: `${name} does not include in-medium screening; the rates are those of independent electrons, too high at small momentum transfer.${offer}`,
    },
  ];
}

/** The accuracy is what test/physics/crystal/dielectric.test.ts measures. */
function twinSentences(name: string, electronsPerCell: number | undefined): string {
  const above =
    electronsPerCell === undefined
      ? 'it gives no electronsPerCell, so that nothing stands for strength above its last energy'
      : 'what it lacks of the f-sum rule stands above its last energy as one pole';
  return (
    `${name} is unscreened and was divided by |ε|², with Im ε from its own numbers and Re ε from them by Kramers–Kronig (random-phase ` +
    `approximation without local fields); ${above}. For the built-in crystals bins differ by at most 4 % from the screened tables that ` +
    'come with the service, and the approximation itself is good to 10–15 %.'
  );
}
