// The sheet: pictures come in, words go out.

import {Figures} from './figures.js';
import {Foot} from './foot.js';
import {Keys} from './keys.js';
import {Ledger} from './ledger.js';
import {Link} from './link.js';
import {Sentence} from './sentence.js';
import {CHANGEOVERS} from './words.js';

const byId = id => document.getElementById(id);
const calm = matchMedia('(prefers-reduced-motion: reduce)');
const LEDGER_MS = 250;
const LOOKS = ['', 'light', 'dark'];

let begun = sessionStorage.getItem('begun') === 'yes';
let latest = null, written = 0, urgent = '';

const send = message => link.send(message);
const figures = new Figures();
const foot = new Foot();
const ledger = new Ledger(lane => send({do: 'hear', lane}));
const sentence = new Sentence(send);
const link = new Link(picture => take(picture), contact => { byId('lost').hidden = contact; });

function take(picture) {
  latest = picture;
  if (picture.caution) byId('caution-text').textContent = picture.caution;
  byId('caution').hidden = begun;
  byId('sheet').hidden = !begun;
  requestAnimationFrame(now => draw(picture, now));
  setTimeout(() => link.next(), calm.matches || !begun ? LEDGER_MS : 0);
}

function draw(picture, now) {
  if (!begun) return;
  const changed = [picture.notice, picture.sentence.heard, picture.output.state].join();
  if (now - written >= LEDGER_MS || changed !== urgent) {
    written = now;
    urgent = changed;
    sentence.show(picture.sentence);
    ledger.show(picture.lanes, picture.sentence.heard, picture.output.silent);
    foot.show(picture);
    figures.showSlow(picture);
  }
  figures.show(picture);
}

function begin() {
  begun = true;
  sessionStorage.setItem('begun', 'yes');
  take(latest);
  byId('sheet').focus();
}

function look() {
  const now = localStorage.getItem('look') || '';
  const next = LOOKS[(LOOKS.indexOf(now) + 1) % LOOKS.length];
  localStorage.setItem('look', next);
  dress();
  foot.say(`The sheet is ${next || 'as the system'}.`);
}

function dress() {
  const wanted = localStorage.getItem('look') || (matchMedia('(prefers-color-scheme: dark)').matches ? 'dark' : 'light');
  document.documentElement.dataset.look = wanted;
  figures.dress();
  if (latest && begun) {
    figures.showSlow(latest);
    figures.show(latest);
  }
}

function nextChangeover() {
  const next = CHANGEOVERS[(CHANGEOVERS.indexOf(latest.sentence.changeover) + 1) % CHANGEOVERS.length];
  send({do: 'changeover', by: next});
}

function close() {
  sentence.close();
  figures.whole(0);
  byId('keys').close();
}

const actions = {
  b: () => send({do: 'back'}), d: () => send({do: 'difference'}), D: () => send({do: 'reference'}),
  '<': () => send({do: 'raise', steps: -1}), '>': () => send({do: 'raise', steps: 1}),
  '+': () => send({do: 'monitor', steps: 1}), '-': () => send({do: 'monitor', steps: -1}), '\u2212': () => send({do: 'monitor', steps: -1}),
  h: nextChangeover, s: () => sentence.toggle('source'), u: () => send({do: 'rise'}), l: () => send({do: 'hear', lane: ledger.cursor + 1}),
  ArrowUp: () => ledger.move(-1), ArrowDown: () => ledger.move(1),
  f: () => foot.say(figures.freeze() ? 'The figures are frozen.' : 'The figures go on.'),
  g1: () => figures.whole(1), g2: () => figures.whole(2), g3: () => figures.whole(3),
  r: () => foot.say('What is heard is recorded where listen was started with --record FILE.'),
  a: () => foot.seen(), t: look, '?': () => byId('keys').open ? close() : byId('keys').showModal(), Escape: close,
};
for (let k = 1; k <= 10; k += 1) actions[String(k % 10)] = () => send({do: 'hear', lane: k});
for (const name of Object.keys(actions)) {
  const act = actions[name];
  actions[name] = () => { if (begun) act(); };
}
const keys = new Keys(actions, () => send({do: 'mute'}));

byId('begin').addEventListener('click', begin);
byId('rest').addEventListener('click', () => {
  keys.lettersRest = !keys.lettersRest;
  byId('rest').textContent = keys.lettersRest ? 'Letter keys rest: wake them' : 'Letter keys work: let them rest';
});
byId('help').addEventListener('click', () => byId('keys').showModal());
matchMedia('(prefers-color-scheme: dark)').addEventListener('change', dress);
window.addEventListener('resize', dress);
dress();
