import type { Page } from '@playwright/test';

import { expect, test } from '#support/browser.ts';
import { handle, makeDesign, open, planeCsv, sentence, stats } from '#support/designer.ts';

// a recorded trace photographs every frame, which without a graphics processor takes longer than drawing it
test.use({ trace: 'off' });

/** Notes every buffer that the handle takes from here on. */
const recordValues = async (page: Page): Promise<() => Promise<number[]>> => {
  const values = await handle(page).evaluateHandle((element) => {
    const seen: number[] = [];
    new MutationObserver(() => seen.push(Number(element.getAttribute('aria-valuenow')))).observe(element, { attributeFilter: ['aria-valuenow'] });
    return seen;
  });
  return () => values.jsonValue();
};

test.beforeEach(async ({ signInAs }) => signInAs('designer'));

test('draws at least ten meshes in a drag of two seconds over 10,000 observations, each for a buffer the pointer had', async ({ page }) => {
  await open(page, await makeDesign(page, planeCsv(100, 100)));
  await expect(page.getByLabel('Figures of this mesh')).toContainText('10,000 observations');
  const box = (await handle(page).boundingBox())!;
  const x = box.x + box.width / 2;
  const y = box.y + box.height / 2;
  const before = (await stats(page)).drawnBuffers.length;
  await page.mouse.move(x, y);
  await page.mouse.down();
  const pointed = await recordValues(page);
  const began = Date.now();
  for (let k = 1; Date.now() - began < 2000; k++) await page.mouse.move(x + 90 * Math.sin(k / 12), y);
  const drawn = (await stats(page)).drawnBuffers.slice(before);
  await page.mouse.up();
  expect(new Set(drawn).size, `drawn: ${drawn.join(' ')}`).toBeGreaterThanOrEqual(10);
  const held = await pointed();
  for (const km of drawn) expect(held).toContain(km);
  const last = Number(await handle(page).getAttribute('aria-valuenow'));
  await expect.poll(async () => (await stats(page)).drawnBuffers.at(-1)).toBe(last);
  await page.keyboard.press('Control+z');
  await expect(sentence(page)).toContainText('Buffer 250 km');
});
