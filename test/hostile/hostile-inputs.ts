import { encodingInputs } from './encoding-inputs.ts';
import { formInputs } from './form-inputs.ts';
import { headerInputs } from './header-inputs.ts';
import type { HostileInput } from './hostile-input.ts';
import { kindInputs } from './kind-inputs.ts';
import { markupInputs } from './markup-inputs.ts';
import { structureInputs } from './structure-inputs.ts';
import { textInputs } from './text-inputs.ts';

/** All hostile inputs, built by code. */
export const hostileInputs: readonly HostileInput[] = [
  ...structureInputs,
  ...headerInputs,
  ...encodingInputs,
  ...markupInputs,
  ...textInputs,
  ...kindInputs,
  ...formInputs,
];
