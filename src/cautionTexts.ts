export interface CautionGroup {
  title: string
  points: { what: string; how: string }[]
}

/** Common practice at such benches; every group defers to the workshop's own rules. */
export const CAUTIONS: CautionGroup[] = [
  {
    title: 'Before plugging in',
    points: [
      { what: 'Monitor level down', how: 'A plug thumps. No headphones while plugging in.' },
      { what: 'Phantom power off', how: 'It can damage an unbalanced output; the ring is the battery line.' },
      { what: 'Battery polarity', how: 'Look before you clip it on.' },
    ],
  },
  {
    title: 'At the bench',
    points: [
      {
        what: 'Strings under tension',
        how: 'Eye protection when tuning up and when cutting. Slacken before you cut.',
      },
      { what: 'Static', how: 'Wrist strap through 1 megohm near open electronics. Off for work on mains.' },
      {
        what: 'Soldering',
        how: 'It burns, its fumes harm: extract them. Leaded alloys: wash before you eat.',
      },
      {
        what: 'Batteries',
        how: 'Tape the terminals before binning or shipping. Never charge primary cells.',
      },
      { what: 'Adhesives and solvents', how: 'Air, gloves, and no solvent near a hot iron.' },
    ],
  },
]

export const CAUTIONS_DEFER =
  'The workshop\u2019s own rules, safety data sheets and local codes come first; mains work and what needs a licence belong to people who hold it.'
