/** Keys: 1 to 9 choose a queue, u takes the last one back, n goes on without settling, l to the list. Single keys can be turned
 *  off (WCAG 2.2, 2.1.4 Character Key Shortcuts), and never act while a modifier is held or a field is typed in. Everything
 *  also works with Tab and Enter, without this script. */
export const settleScript = `
'use strict';
const place = 'tallypost-keys';
const stored = () => { try { return localStorage.getItem(place); } catch { return null; } };
let isOn = stored() !== 'off';
const toggle = document.getElementById('keys');
const show = () => { if (toggle) { toggle.hidden = false; toggle.textContent = isOn ? 'Keys are on' : 'Keys are off'; toggle.setAttribute('aria-pressed', String(isOn)); } };
if (toggle) toggle.addEventListener('click', () => {
  isOn = !isOn;
  try { localStorage.setItem(place, isOn ? 'on' : 'off'); } catch {}
  show();
});
show();
let isGone = false;
document.addEventListener('submit', (event) => { if (isGone) event.preventDefault(); isGone = true; });
window.addEventListener('pageshow', () => { isGone = false; });
document.addEventListener('keydown', (event) => {
  if (event.ctrlKey || event.altKey || event.metaKey || event.isComposing || event.repeat) return;
  if (event.target instanceof HTMLElement && event.target.matches('input, textarea, select')) return;
  const choices = [...document.querySelectorAll('.choices button')];
  if (event.key === 'ArrowDown' || event.key === 'ArrowUp') {
    const at = choices.indexOf(document.activeElement);
    if (at < 0 && !(document.activeElement === document.body)) return;
    const next = choices[at + (event.key === 'ArrowDown' ? 1 : at < 0 ? 1 : -1)];
    if (next) { event.preventDefault(); next.focus(); }
    return;
  }
  if (!isOn) return;
  const act = document.querySelector('[data-key="' + CSS.escape(event.key.toLowerCase()) + '"]');
  if (act instanceof HTMLElement) { event.preventDefault(); act.click(); }
});
`;
