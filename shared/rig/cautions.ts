/**
 * Names the words below; whoever signed an older version has to sign again. Raise it whenever they change: a test keeps the hash of each
 * version that was ever signed.
 */
export const cautionsVersion = 1;

/** What whoever arms a rig or sets it in motion must have read, seen to and signed; shown where masses are about to move. */
export const cautions: readonly { title: string; words: string }[] = [
  {
    title: 'Heavy masses',
    words: 'They crush, and they fall. Secured on the turntable, lifted by two people, nobody and nothing inside the swept circle.',
  },
  { title: 'Lead', words: 'Gloves on, hands washed afterwards, no food or drink in the room.' },
  { title: 'Laser', words: 'Class as labelled (IEC 60825-1), beam ended on a stop, nobody looks into it, not at the height of eyes.' },
  { title: 'Belt and turntable', words: 'They catch fingers, hair and sleeves: hands off while the drivers have current.' },
  { title: 'Mains', words: 'Covers closed, cables out of the swept circle.' },
  {
    title: 'Emergency stop',
    words:
      'Stop in this application is no emergency stop. A hard-wired one (ISO 13850) is within reach at the rig and was tried. Local codes and licensed practice come first.',
  },
];

/** The words as they are signed. */
export const cautionsText = (): string => cautions.map(({ title, words }) => `${title}: ${words}`).join('\n');
