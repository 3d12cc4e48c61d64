import type { Design } from '#schemas/designs.ts';
import { expect, expectAccessible, test } from '#support/browser.ts';
import { handle, makeDesign, open, planeCsv, RECIPE, saveState, sentence, stats } from '#support/designer.ts';

test.beforeEach(async ({ signInAs }) => signInAs('designer'));

test('moves the boundary by keyboard, undoes and redoes, and saves by itself', async ({ page }) => {
  await open(page, await makeDesign(page, planeCsv(12, 10)));
  await expect(sentence(page)).toContainText('Buffer 250 km = 2.1 D.');
  await handle(page).focus();
  await page.keyboard.press('PageUp');
  await expect(sentence(page)).toContainText('Buffer 300 km = 2.5 D.');
  await page.keyboard.press('ArrowLeft');
  await expect(sentence(page)).toContainText('Buffer 295 km');
  await expect(handle(page)).toHaveAttribute('aria-valuetext', /Buffer 295 km = 2\.5 D\. Largest boundary effect .* at observation \d+\./);
  await expect.poll(async () => (await stats(page)).drawnBuffers.at(-1)).toBe(295);
  await expect(saveState(page)).toHaveText(/saved, revision [23]/);

  await page.keyboard.press('Control+z');
  await expect(sentence(page)).toContainText('Buffer 300 km');
  await page.keyboard.press('Control+z');
  await expect(sentence(page)).toContainText('Buffer 250 km');
  await expect(page.getByRole('button', { name: 'Undo' })).toBeDisabled();
  await page.keyboard.press('Control+Shift+z');
  await page.getByRole('button', { name: 'Redo' }).click();
  await expect(sentence(page)).toContainText('Buffer 295 km');
  await expect.poll(async () => (await stats(page)).drawnBuffers.at(-1)).toBe(295);

  await expect(saveState(page)).toHaveText(/saved, revision/);
  await page.reload();
  await expect(sentence(page)).toContainText('Buffer 295 km');
});

test('changes every part of the recipe from the keyboard', async ({ page }) => {
  await open(page, await makeDesign(page, planeCsv(12, 10)));
  const figures = page.getByLabel('Figures of this mesh');
  const before = await figures.innerText();
  await page.getByRole('radio', { name: 'Box' }).focus();
  await page.keyboard.press('Space');
  await page.getByRole('radio', { name: 'Round' }).focus();
  await page.keyboard.press('ArrowRight');
  await expect(page.getByRole('radio', { name: 'Square' })).toBeChecked();
  await page.getByLabel('Core spacing').focus();
  await page.keyboard.type('20');
  await page.getByLabel('Growth per element').fill('1.4');
  await expect.poll(() => figures.innerText()).not.toBe(before);

  await page.locator('summary', { hasText: 'Near observations' }).press('Enter');
  await page.getByLabel('Treat as one place when closer than').fill('30');
  await expect(figures).not.toContainText('120 observations');
  await page.getByRole('radio', { name: 'Combine' }).focus();
  await page.keyboard.press('ArrowLeft');
  await expect(page.getByRole('radio', { name: 'Refuse' })).toBeChecked();
  await expect(page.getByRole('alert').filter({ hasText: 'No mesh for this recipe' })).toBeVisible();
  await expect(page.getByText('The map still shows the last mesh')).toBeVisible();
  await page.keyboard.press('Control+z');
  await expect(page.getByText('No mesh for this recipe')).toHaveCount(0);

  await page.getByLabel('Buffer (km)').fill('-3');
  await expect(page.getByRole('alert').filter({ hasText: 'At least 0.001 km' })).toBeVisible();
  await expect(sentence(page)).toContainText('Buffer 250 km');
});

test('pans and zooms by the camera alone: no upload of geometry, no render of React', async ({ page }) => {
  await open(page, await makeDesign(page, planeCsv(40, 40)));
  const map = page.getByRole('application', { name: /^Map of the mesh/ });
  const box = (await map.boundingBox())!;
  const [x, y] = [box.x + box.width / 2, box.y + box.height / 2];
  await expect(page.getByText(/mesh built in/)).toBeVisible();
  await page.mouse.move(x, y);
  await page.waitForTimeout(300);
  const before = await stats(page);
  await page.mouse.down();
  for (let k = 0; k < 20; k++) await page.mouse.move(x + 5 * k, y + 3 * k);
  await page.mouse.up();
  for (let k = 0; k < 6; k++) await page.mouse.wheel(0, -100);
  await map.focus();
  for (const key of ['Shift+ArrowLeft', 'Shift+ArrowUp', '+', '-', '0']) await page.keyboard.press(key);
  await page.waitForTimeout(800);
  const after = await stats(page);
  expect(after.frames - before.frames).toBeGreaterThan(10);
  expect(after.bufferUploads - before.bufferUploads).toBe(0);
  expect(after.commits - before.commits).toBe(0);
});

test('drags the boundary on the map', async ({ page }) => {
  await open(page, await makeDesign(page, planeCsv(12, 10)));
  const map = page.getByRole('application', { name: /^Map of the mesh/ });
  const box = (await map.boundingBox())!;
  // the fitted boundary's top side lies in the middle at the edge of the picture's inner 88 %
  let grabbed: number | null = null;
  for (let y = box.y + 6; y < box.y + box.height / 2 && grabbed === null; y += 4) {
    await page.mouse.move(box.x + box.width / 2, y);
    if ((await map.evaluate((element: HTMLElement) => element.style.cursor)) === 'move') grabbed = y;
  }
  expect(grabbed).not.toBeNull();
  await page.mouse.down();
  await page.mouse.move(box.x + box.width / 2, grabbed! + 15);
  await page.mouse.move(box.x + box.width / 2, grabbed! + 30);
  await page.mouse.up();
  const buffer = Number(await handle(page).getAttribute('aria-valuenow'));
  expect(buffer).toBeLessThan(240);
  await expect.poll(async () => (await stats(page)).drawnBuffers.at(-1)).toBe(buffer);
});

test('goes from node to node on the map and says what is there', async ({ page }) => {
  await open(page, await makeDesign(page, planeCsv(12, 10)));
  const map = page.getByRole('application', { name: /^Map of the mesh/ });
  await map.focus();
  await page.keyboard.press('ArrowRight');
  const tip = map.getByRole('status');
  await expect(tip).toContainText(/node|observation/);
  const first = await tip.innerText();
  await page.keyboard.press('ArrowRight');
  await expect(tip).not.toHaveText(first);
  await page.keyboard.press('Escape');
  await expect(tip).toBeHidden();
});

test('checks on the server, shows a finding on the map, and asks for a reason to save', async ({ page }) => {
  await open(page, await makeDesign(page, planeCsv(12, 10), { ...RECIPE, bufferKm: 100 }));
  await page.getByRole('button', { name: 'Check', exact: true }).click();
  const findings = page.getByTestId('findings');
  await expect(findings).toContainText(/[1-9] fail/, { timeout: 60_000 });
  await expect(findings.getByText('fail', { exact: false }).first()).toBeVisible();
  await page.waitForTimeout(300);
  const before = (await stats(page)).frames;
  await page.getByRole('button', { name: /^Show me/ }).first().click();
  await expect.poll(async () => (await stats(page)).frames).toBeGreaterThan(before);

  await page.getByRole('button', { name: 'Save version…' }).click();
  const dialog = page.getByRole('dialog');
  await expect(dialog).toContainText('saved only with a reason');
  const save = dialog.getByRole('button', { name: 'Save version' });
  await expect(save).toBeDisabled();
  await dialog.getByLabel('Note').fill('Short buffer, to compare');
  await dialog.getByLabel('Reason').fill('Kept on purpose to show what a short buffer does.');
  await expectAccessible(page);
  await save.click();
  await expect(dialog).toContainText('Version saved', { timeout: 60_000 });
  await dialog.getByRole('link', { name: 'Open the version' }).click();
  await expect(page).toHaveURL(/\/versions\/[0-9a-f-]{36}/);
  await expect(page.getByText('Kept on purpose to show what a short buffer does.')).toBeVisible();
  await expect(page.getByRole('application', { name: /^Map of the mesh of version/ })).toBeVisible();
});

test('refuses to save unchecked when a finding fails, then takes a reason', async ({ page }) => {
  await open(page, await makeDesign(page, planeCsv(12, 10), { ...RECIPE, bufferKm: 100 }));
  await page.getByRole('button', { name: 'Save version…' }).click();
  const dialog = page.getByRole('dialog');
  await dialog.getByRole('button', { name: 'Save version' }).click();
  await expect(dialog.getByRole('alert')).toBeVisible({ timeout: 60_000 });
  await dialog.getByLabel('Reason').fill('To have something to compare with.');
  await dialog.getByRole('button', { name: 'Save version' }).click();
  await expect(dialog).toContainText('Version saved', { timeout: 60_000 });
});

test('says when the design has changed since its check', async ({ page }) => {
  await open(page, await makeDesign(page, planeCsv(12, 10)));
  await page.getByRole('button', { name: 'Check', exact: true }).click();
  await expect(page.getByTestId('findings')).toContainText(/\d+ pass/, { timeout: 60_000 });
  await expect(page.getByText('has changed since this check')).toHaveCount(0);
  await handle(page).focus();
  await page.keyboard.press('ArrowRight');
  await expect(page.getByText('has changed since this check')).toBeVisible();
  await page.keyboard.press('Control+z');
  await expect(page.getByText('has changed since this check')).toHaveCount(0);
});

test('keeps both versions when somebody else saved first', async ({ page, baseURL, problems }) => {
  const design = await makeDesign(page, planeCsv(12, 10));
  await open(page, design);
  const theirs = await page.request.patch(`/api/v1/designs/${design.id}`, { headers: { origin: baseURL! }, data: { revision: 1, recipe: { ...RECIPE, bufferKm: 444 } } });
  expect(theirs.ok()).toBe(true);
  await handle(page).focus();
  await page.keyboard.press('PageUp');
  const conflict = page.getByRole('alertdialog', { name: 'Two people changed this design' });
  await expect(conflict).toBeVisible();
  expect(problems.splice(0)).toEqual([expect.stringContaining('409')]);
  await expect(conflict.getByRole('row', { name: /buffer/ })).toHaveText(/300.*444/);
  await expect(saveState(page)).toContainText('both are kept');
  const kept = (await (await page.request.get(`/api/v1/designs/${design.id}`)).json()) as Design;
  expect(kept.recipe.bufferKm).toBe(444);
  await expectAccessible(page);

  await conflict.getByRole('button', { name: /^Take theirs/ }).click();
  await expect(sentence(page)).toContainText('Buffer 444 km');
  await page.getByRole('button', { name: 'Undo' }).click();
  await expect(sentence(page)).toContainText('Buffer 300 km');
  await expect(saveState(page)).toHaveText(/saved, revision 3/);
});

test('saves mine as a new design after a conflict', async ({ page, baseURL, problems }) => {
  const design = await makeDesign(page, planeCsv(12, 10));
  await open(page, design);
  await page.request.patch(`/api/v1/designs/${design.id}`, { headers: { origin: baseURL! }, data: { revision: 1, recipe: { ...RECIPE, bufferKm: 444 } } });
  await handle(page).focus();
  await page.keyboard.press('PageUp');
  const conflict = page.getByRole('alertdialog');
  await conflict.getByLabel('Name of a new design').fill('My own try');
  expect(problems.splice(0)).toEqual([expect.stringContaining('409')]);
  await conflict.getByRole('button', { name: 'Save mine as a new design' }).click();
  await expect(page).not.toHaveURL(new RegExp(design.id));
  await expect(page.getByRole('heading', { level: 1, name: 'My own try' })).toBeAttached();
  await expect(sentence(page)).toContainText('Buffer 300 km');
});

test('shows everything to a viewer and changes nothing', async ({ page, signInAs }) => {
  const design = await makeDesign(page, planeCsv(12, 10));
  await signInAs('viewer');
  await open(page, design);
  await expect(page.getByLabel('Buffer (km)')).toBeDisabled();
  await handle(page).focus();
  await page.keyboard.press('PageUp');
  await expect(sentence(page)).toContainText('Buffer 250 km');
  await expect(page.getByRole('button', { name: 'Check', exact: true })).toBeDisabled();
});

test('is accessible in both themes, wide and narrow', async ({ page }) => {
  await open(page, await makeDesign(page, planeCsv(12, 10)));
  for (const section of ['Observations used', 'Near observations', 'Correlation model']) await page.getByText(section, { exact: true }).click();
  await expectAccessible(page);
  await page.setViewportSize({ width: 360, height: 780 });
  await expect.poll(() => page.evaluate(() => document.documentElement.scrollWidth)).toBeLessThanOrEqual(360);
  await expectAccessible(page);
});
