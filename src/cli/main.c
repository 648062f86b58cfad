/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/mho.h>

#include <stdio.h>

int main(void)
{
  printf("mho %s\n", mho_version());
  return 0;
}
