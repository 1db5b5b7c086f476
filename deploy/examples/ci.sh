#!/bin/sh
# A job for any CI: reviews what the folder's pathgate.toml names, and leaves reports behind.
#
#   ci.sh [FOLDER [REPORTS]]      here and build/pathgate where they are left out
#
# pathgate.sarif is for code scanning, pathgate.xml (JUnit) for the list of tests, pathgate.md for a comment on the
# change. The job ends with the status of the review: 0 nothing falls short, 1 some config does, 2 not judged.
set -u
cd "${1:-.}" || exit 2
reports=${2:-build/pathgate}

status=0
# "|| status" and no pipe: a pipe would end with the status of its last command, and let everything pass.
pathgate review \
  --output "sarif=$reports/pathgate.sarif" \
  --output "junit=$reports/pathgate.xml" \
  --output "markdown=$reports/pathgate.md" || status=$?

# Here a job uploads its reports. Whatever that ends with, the review's status stands.

exit "$status"
