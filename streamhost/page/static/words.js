// Numbers and words as the sheet writes them.

export const MINUS = '\u2212';
export const CHANGEOVERS = ['keep', 'cold', 'carry', 'warm', 'fade'];
export const SOURCES = ['silence', 'tone:1000', 'tones:60,7000', 'sweep:20,20000,10', 'white', 'pink', 'impulses:1'];

export const KEYS = [
  ['1 to 9, 0', 'hear lanes 1 to 10'], ['b', 'back to the lane before'],
  ['↑ ↓', 'cursor'], ['l', 'hear the row'],
  ['h', 'how a change takes over'], ['s', 'what comes in'],
  ['d', 'difference'], ['Shift+D', 'against exact or before'],
  ['< >', 'difference 6 dB down, up'], ['+ −', 'monitor 1 dB up, down'],
  ['space', 'mute, always'], ['u', 'come up by ramp'],
  ['f', 'freeze the figures'], ['g, then 1, 2, 3', 'a figure on the whole sheet'],
  ['r', 'record'], ['a', 'seen'],
  ['t', 'light, dark, as the system'], ['?', 'these keys'],
  ['Esc', 'close; never changes sound'],
];

export function figure(value, decimals = 1) {
  if (value === null || value === undefined) return '';
  if (typeof value === 'string') return value;
  return value.toFixed(decimals).replace('-', MINUS);
}

export function level(value) {
  return value === null ? `${MINUS}\u221e` : figure(value);
}

export function short(value) {
  return String(Number(value.toFixed(1))).replace('-', MINUS);
}

export function differenceWord(sentence) {
  if (!sentence.differs) return 'not raised';
  const from = sentence.against === 'ideal' ? 'exact' : `lane ${sentence.before}`;
  return `${from} +${short(sentence.raise)} dB`;
}
