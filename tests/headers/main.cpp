// SPDX-License-Identifier: BSL-1.0
// Linked with one file for each header: a function that is not inline would be defined twice and stop the link.
int main() { return 0; }
