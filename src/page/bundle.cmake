# Run while building: fetches the locked packages into WORK, bundles, and writes OUTPUT. Never fails the build.
file(COPY ${SOURCE}/package.json ${SOURCE}/package-lock.json ${SOURCE}/.npmrc ${SOURCE}/build.mjs ${SOURCE}/src
     DESTINATION ${WORK})

file(SHA256 ${SOURCE}/package-lock.json lock)
set(installed "")
if(EXISTS ${WORK}/installed)
  file(READ ${WORK}/installed installed)
endif()
set(result 0)
if(NOT installed STREQUAL lock)
  execute_process(COMMAND ${NPM} ci --ignore-scripts --prefer-offline --no-audit --no-fund WORKING_DIRECTORY ${WORK}
                  RESULT_VARIABLE result OUTPUT_VARIABLE said ERROR_VARIABLE said)
  if(result EQUAL 0)
    file(WRITE ${WORK}/installed ${lock})
  endif()
endif()
if(result EQUAL 0)
  execute_process(COMMAND ${NODE} build.mjs ${OUTPUT} WORKING_DIRECTORY ${WORK}
                  RESULT_VARIABLE result OUTPUT_VARIABLE said ERROR_VARIABLE said)
endif()
if(NOT result EQUAL 0)
  message("${said}")
  message("The page could not be bundled (Node 18 or later, and its packages once, are needed): built without it, so "
          "`report` and `review` will say that they cannot. Configure again to try again.")
  file(COPY_FILE ${STAND_IN} ${OUTPUT})
endif()
