/* balance.h - the whole chain in one command: six processes joined by pipes. */
#ifndef LOPSIDE_DESK_BALANCE_H
#define LOPSIDE_DESK_BALANCE_H

/* `lopside balance SHEET [--as FORM] [-o FILE]`; returns the exit code. */
int desk_balance(int argc, char **argv);

#endif
